"""Reading, refusing and saving project files."""

import json
import os
import stat
from pathlib import Path

import jsonschema
import pytest

from solver.project import file, upgrades
from solver.project.model import Amount, Candidates, Case, Project, Quantity, Stream
from solver.project.schema import SCHEMA_FILE, project_schema, schema_text

FILES = Path(__file__).parents[2] / "files"
SAMPLES = sorted((Path(__file__).parents[3] / "samples").glob("*.thalweg"))


def _project(title="plant"):
    stream = Stream(
        name="feed",
        T=Quantity(value=25, unit="degC"),
        p=Quantity(value=1.5, unit="bar"),
        amounts=(Amount(species="CO2", value=1e-12, unit="mol"),),
    )
    return Project(title=title, notes="two\nlines — é 硫", cases=(Case(streams=(stream,)),))


def _document(**changes):
    return {**json.loads(file.text_of(_project())), **changes}


def _fault(data: bytes):
    with pytest.raises(file.ProjectFileError) as caught:
        file.parse(data, "plant.thalweg")
    text = str(caught.value)
    assert text.startswith("plant.thalweg")
    assert "\n" not in text
    return caught.value


def test_what_is_saved_is_read_back(tmp_path):
    path = tmp_path / "plant.thalweg"
    file.write(_project(), path)
    assert file.read(path) == _project()
    assert json.loads(path.read_text("utf-8"))["format"] == "thalweg-project"
    assert os.listdir(tmp_path) == ["plant.thalweg"]


def test_unfinished_input_survives_saving(tmp_path):
    half = Project(
        cases=(
            Case(
                streams=(
                    Stream(
                        name="",
                        T=Quantity(value="", unit="degC"),
                        p=Quantity(value="one", unit="furlong"),
                        amounts=(Amount(species="unobtainium", value="2..5", unit="mol"),),
                    ),
                ),
                candidates=Candidates(added=("nothing of the sort",)),
            ),
        )
    )
    file.write(half, tmp_path / "half.thalweg")
    assert file.read(tmp_path / "half.thalweg") == half


def test_half_a_character_does_not_cost_the_project(tmp_path):
    file.write(_project("plant \ud83d"), tmp_path / "plant.thalweg")
    assert file.read(tmp_path / "plant.thalweg").title == "plant ?"


def test_what_is_far_too_large_is_not_read_to_its_end():
    with pytest.raises(file.ProjectFileError, match="too large"):
        file.read("/dev/zero")


def test_whole_numbers_are_written_as_typed():
    assert '"value": 25,' in file.text_of(_project())


def test_the_file_of_every_version_still_opens():
    known = {int(path.stem.removeprefix("version-")) for path in FILES.glob("version-*.thalweg")}
    assert known == set(range(1, upgrades.VERSION + 1))
    for path in FILES.glob("version-*.thalweg"):
        project = file.read(path)
        assert [case.name for case in project.cases] == ["flow", "unfinished"]
        assert project.cases[0].streams[1].amounts[1].value == 1980
        assert project.cases[1].streams[0].amounts[1].value == "2..5"


def test_an_older_document_is_upgraded_step_by_step():
    def name_to_title(document):
        rest = {k: v for k, v in document.items() if k != "name"}
        return {**rest, "title": document["name"]}

    def shout(document):
        return {**document, "title": document["title"].upper()}

    old = {"format": file.FORMAT, "version": 1, "name": "kiln"}
    new = upgrades.upgrade(old, {1: name_to_title, 2: shout}, newest=3)
    assert new == {"format": file.FORMAT, "version": 3, "title": "KILN"}
    assert old == {"format": file.FORMAT, "version": 1, "name": "kiln"}


def test_there_is_one_upgrade_step_for_every_older_version():
    assert set(upgrades.STEPS) == set(range(1, upgrades.VERSION))


def test_a_newer_file_is_refused_and_left_alone(tmp_path):
    path = tmp_path / "newer.thalweg"
    data = json.dumps(_document(version=99)).encode()
    path.write_bytes(data)
    with pytest.raises(file.ProjectFileError, match=r"newer Thalweg .*99"):
        file.read(path)
    with pytest.raises(file.ProjectFileError, match="save under another name"):
        file.write(_project(), path)
    assert path.read_bytes() == data
    assert os.listdir(tmp_path) == ["newer.thalweg"]


@pytest.mark.parametrize(
    ("data", "place", "text"),
    [
        (b"", "line 1", "empty"),
        (b"  \n ", "line 1", "empty"),
        (b"\x7fELF\x02\x01\xff\xfe", "line 1, column 7", "UTF-8"),
        (b'{"a":\n "\xff"}', "line 2, column 3", "UTF-8"),
        (b'{"format": "thalweg-project",\n "version": 1,\n "title"', "line 3", "breaks off"),
        (b'{"format": "thalweg-project",\n "version": 1,, }', "line 2, column 15", "damaged"),
        (b"[1, 2]", "format", "no Thalweg project"),
        (b"3", "format", "no Thalweg project"),
        (b'{"format": "other"}', "format", "no Thalweg project"),
        (b"[" * 100_000, "line 1", "no Thalweg project"),
        (b'{"format": "thalweg-project", "format": "x"}', "format", "twice"),
        (b'{"format": "thalweg-project", "version": NaN}', "", "NaN"),
        (b'{"format": "thalweg-project"}', "version", "None"),
        (b'{"format": "thalweg-project", "version": "1"}', "version", "'1'"),
        (b'{"format": "thalweg-project", "version": 0}', "version", "0"),
        (b'{"format": "thalweg-project", "version": true}', "version", "True"),
    ],
)
def test_a_damaged_file_is_refused_with_the_place(data, place, text):
    fault = _fault(data)
    assert fault.field.startswith(place)
    assert text in str(fault)


@pytest.mark.parametrize(
    ("path", "value", "text"),
    [
        (["titel"], "x", "titel: is not a field known here"),
        (["cases"], [], "cases: must not be empty"),
        (["cases"], {}, "cases: must be a list"),
        (["cases", 0, "fixed"], {"pair": "T,q"}, "cases[0].fixed.pair: must be 'T,p'"),
        (
            ["cases", 0, "fixed"],
            {"values": {"Q": {"value": 1, "unit": "K"}}},
            "cases[0].fixed.values.Q",
        ),
        (["cases", 0, "streams", 0, "T"], {"value": 25}, "cases[0].streams[0].T.unit: is missing"),
        (
            ["cases", 0, "streams", 0, "p", "value"],
            None,
            "cases[0].streams[0].p.value: must be a number",
        ),
        (
            ["cases", 0, "streams", 0, "amounts", 0, "value"],
            True,
            "cases[0].streams[0].amounts[0].value: must be a number",
        ),
        (["cases", 0, "streams", 0, "p"], 5, "cases[0].streams[0].p: must be a group of fields"),
        (["cases", 0, "gas"], "vapour", "cases[0].gas: must be 'ideal'"),
        (["notes"], 7, "notes: must be a text"),
        (["cases", 0, "streams", 0, "T", "value"], 10**400, "T.value: must be a number"),
    ],
)
def test_a_field_that_does_not_fit_is_named_by_its_path(path, value, text):
    document = _document()
    inner = document
    for part in path[:-1]:
        inner = inner[part]
    inner[path[-1]] = value
    said = str(_fault(json.dumps(document).encode()))
    assert text in said
    assert "more fault" not in said


def test_a_byte_order_mark_does_no_harm():
    assert file.parse(b"\xef\xbb\xbf" + file.text_of(_project()).encode()) == _project()


def test_saving_over_a_damaged_file_is_refused(tmp_path):
    path = tmp_path / "plant.thalweg"
    path.write_bytes(b"not a project")
    with pytest.raises(file.ProjectFileError, match="another name"):
        file.write(_project(), path)
    assert path.read_bytes() == b"not a project"


def test_saving_replaces_an_empty_file_and_an_older_project(tmp_path):
    path = tmp_path / "plant.thalweg"
    path.touch()
    file.write(_project("one"), path)
    file.write(_project("two"), path)
    assert file.read(path).title == "two"


def test_a_failure_while_writing_leaves_the_old_file_whole(tmp_path, monkeypatch):
    path = tmp_path / "plant.thalweg"
    file.write(_project("one"), path)

    def full(_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(file.ProjectFileError, match="no space left"):
        file.write(_project("two"), path)
    assert file.read(path).title == "one"
    assert os.listdir(tmp_path) == ["plant.thalweg"]


def test_the_content_is_on_the_disk_before_the_name_changes(tmp_path, monkeypatch):
    order = []
    real_sync, real_replace = os.fsync, os.replace
    monkeypatch.setattr(os, "fsync", lambda h: (order.append("flush"), real_sync(h))[1])
    monkeypatch.setattr(os, "replace", lambda a, b: (order.append("rename"), real_replace(a, b))[1])
    file.write(_project(), tmp_path / "plant.thalweg")
    assert order[:2] == ["flush", "rename"]


def test_permissions_and_links_are_kept(tmp_path):
    real = tmp_path / "real.thalweg"
    file.write(_project("one"), real)
    assert stat.S_IMODE(real.stat().st_mode) & 0o077 == 0o066 & ~_mask()
    real.chmod(0o640)
    link = tmp_path / "link.thalweg"
    link.symlink_to(real)
    file.write(_project("two"), link)
    assert link.is_symlink()
    assert file.read(real).title == "two"
    assert stat.S_IMODE(real.stat().st_mode) == 0o640


def _mask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask


@pytest.mark.parametrize("name", ["nowhere/plant.thalweg", "."])
def test_places_that_hold_no_file_are_named(tmp_path, name):
    with pytest.raises(file.ProjectFileError) as caught:
        file.read(tmp_path / name)
    assert str(tmp_path) in str(caught.value)
    with pytest.raises(file.ProjectFileError):
        file.write(_project(), tmp_path / name)


def test_the_schema_in_the_repository_is_that_of_the_model():
    assert SCHEMA_FILE.read_text("utf-8") == schema_text(), (
        "run python -m solver.project.schema, and raise the version if files have changed"
    )


@pytest.mark.parametrize("path", [*SAMPLES, *FILES.glob("version-*.thalweg")], ids=lambda p: p.stem)
def test_files_fit_the_schema(path):
    jsonschema.validate(json.loads(path.read_text("utf-8")), project_schema())


def test_the_schema_refuses_what_the_program_refuses():
    schema = project_schema()
    jsonschema.validate(_document(), schema)
    for wrong in ({"version": 2}, {"titel": "x"}, {"cases": []}):
        with pytest.raises(jsonschema.ValidationError):
            jsonschema.validate(_document(**wrong), schema)
