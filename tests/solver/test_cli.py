"""The headless commands as a user runs them."""

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from solver import cli
from solver.project import file
from solver.project.model import (
    Amount,
    Case,
    FixedPair,
    Interaction,
    Project,
    Quantity,
    Stream,
)

ROOT = Path(__file__).parents[2]
SAMPLES = sorted((ROOT / "samples").glob("*.thalweg"))


def q(value, unit):
    return Quantity(value=value, unit=unit)


def project(pair="T,p", heat=None, name="Case 1", amount=1.0, **values):
    stream = Stream(
        name="feed",
        T=q(25, "degC"),
        p=q(1, "bar"),
        amounts=(Amount(species="N2", value=amount, unit="mol"),),
    )
    fixed = FixedPair(pair=pair, values=values, heat=heat)
    return Case(name=name, streams=(stream,), fixed=fixed)


@pytest.fixture
def save(tmp_path):
    def _save(*cases):
        path = tmp_path / "plant.thalweg"
        file.write(Project(title="Plant", cases=cases), path)
        return str(path)

    return _save


def run(capsys, *words):
    code = cli.main(list(words))
    out, err = capsys.readouterr()
    assert "Traceback" not in out + err
    return code, out, err


@pytest.mark.parametrize("path", SAMPLES, ids=lambda p: p.stem)
def test_settle_prints_every_case(path, capsys):
    code, out, err = run(capsys, "settle", str(path))
    assert (code, err) == (0, "")
    for case in file.read(path).cases:
        assert case.name in out
    pairs = {case.fixed.pair for case in file.read(path).cases}
    assert ("  work  " if pairs == {"S,p"} else "  heat  ") in out
    for word in ("T  ", "p  ", "V  ", "mol % of phase", "phases", "proof", "limit and not"):
        assert word in out
    sealed = any(pair.endswith("V") for pair in pairs)
    assert ("no design basis" in out) is sealed
    assert out.rstrip().endswith("Local codes and a licensed engineer decide.")
    assert "e-0" not in out
    assert "e+0" not in out


def test_json_has_the_keys_it_promises(capsys):
    code, out, err = run(capsys, "settle", str(ROOT / "samples/reformer-outlet.thalweg"), "--json")
    assert (code, err) == (0, "")
    document = json.loads(out)
    assert (document["format"], document["version"]) == ("thalweg-answer", 1)
    case = document["cases"][0]
    assert set(case) == {
        "name", "pair", "basis", "T", "p", "V", "H", "U", "S", "G", "heat", "heat_is", "fed",
        "amounts", "fractions", "phases", "gas", "proof", "outside_range", "messages", "cautions",
    }  # fmt: skip
    assert case["basis"] == "flow"
    assert case["T"] == pytest.approx(1118.15)
    assert case["p"] == pytest.approx(21.8e5 + 101325)
    assert case["H"] - case["fed"]["H"] == pytest.approx(case["heat"])
    assert sum(case["phases"].values()) == pytest.approx(sum(case["amounts"].values()))
    assert set(case["proof"]) == {
        "element_residual", "energy_residual", "gap", "absent", "model", "restrictions",
        "rigorous", "stationarity", "tangent_distance", "starts",
    }  # fmt: skip
    assert case["proof"]["absent"]["C(gr)"] < 1


def test_a_real_gas_is_told_phase_by_phase(capsys):
    path = str(ROOT / "samples/wet-syngas-cooler.thalweg")
    code, out, err = run(capsys, "settle", path)
    assert (code, err) == (0, "")
    rows = [line.split() for line in out.splitlines() if line.startswith("  H2O ")]
    assert [row[-1] for row in rows] == ["gas", "liquid", "gas", "liquid"]
    assert float(rows[1][-2]) > 99.8
    assert "  gas     Soave-Redlich-Kwong; no k_ij is known for these pairs: all zero" in out
    assert "  left out  H2O(l): the liquid of the equation of state stands for it" in out
    assert "caution Dense phase with H2O" in out
    assert "from 5 starts: no better state found; no rigorous bound" in out
    assert "ideal beside real" not in out
    assert sum(line.startswith("  phases  gas ") for line in out.splitlines()) == 2


def test_the_ideal_answer_stands_beside_the_real_one_where_asked_for(capsys):
    path = str(ROOT / "samples/ammonia-loop.thalweg")
    code, out, err = run(capsys, "settle", path, "--beside-ideal")
    assert (code, err) == (0, "")
    assert "7 published k_ij, all others zero" in out
    row, chilled = (line.split() for line in out.splitlines() if "NH3, mol % of gas" in line)
    assert float(chilled[-3]) < 0.3 * float(chilled[-2])
    real, ideal, change = (float(text.replace("−", "-")) for text in row[-3:])
    assert real - ideal == pytest.approx(change, abs=0.01)
    assert 1.4 < change < 1.7
    assert "gas, % of all moles" in out  # of the chiller, where the ideal gas has no liquid
    _, out, _ = run(capsys, "settle", path, "--beside-ideal", "--json")
    case = json.loads(out)["cases"][0]
    shares = case["beside_ideal"]["shares"]["NH3"]
    assert shares["of"] == "gas"
    assert shares["real"] == pytest.approx(case["fractions"]["NH3"])
    assert case["gas"]["model"] == "pr"
    assert {(pair["a"], pair["b"]) for pair in case["gas"]["interactions"]} >= {("N2", "NH3")}
    assert all(pair["source"] for pair in case["gas"]["interactions"])
    assert case["proof"]["rigorous"] is False
    assert case["proof"]["starts"] > 0
    assert sum(case["gas"]["fluids"]["gas"].values()) == pytest.approx(case["phases"]["gas"])


def test_an_ideal_case_has_nothing_beside_it(capsys, save):
    code, out, err = run(capsys, "settle", save(project(T=q(900, "K"))), "--beside-ideal")
    assert (code, err) == (0, "")
    assert "the gas of this case is ideal already" in out
    _, out, _ = run(capsys, "settle", save(project(T=q(900, "K"))), "--beside-ideal", "--json")
    assert json.loads(out)["cases"][0]["beside_ideal"] is None


def test_a_wrong_pair_is_named_with_its_field(capsys, save):
    case = project(T=q(900, "K")).model_copy(
        update={"gas": "pr", "interactions": (Interaction(a="N2", b="Ar", k=0.1),)}
    )
    code, out, err = run(capsys, "settle", save(case))
    assert code == 2
    assert out == ""
    assert err.startswith("thalweg: plant.thalweg, interactions[0].b: Ar is not among the")


def test_restrictions_and_reactions_are_told_with_their_figures(capsys):
    path = str(ROOT / "samples/aged-reformer.thalweg")
    code, out, err = run(capsys, "settle", path, "--reactions")
    assert (code, err) == (0, "")
    held = [line for line in out.splitlines() if line.startswith("  held")]
    assert len(held) == 5
    assert "K(T − 38 K); costs 30.35 kW of Gibbs energy" in held[-1]
    assert "the set of the case" in out
    for word in ("extent, kmol/h", "ln K", "Q/K", "ΔH(T), kJ/mol", "ΔG(T), kJ/mol", "38.00"):
        assert word in out
    assert "CH4 + H2O = CO + 3 H2  " in out
    code, plain, _ = run(capsys, "settle", path)
    assert "extent" not in plain
    assert [line for line in plain.splitlines() if line.startswith("  held")] == held


def test_reactions_are_part_of_the_json_where_asked_for(capsys):
    path = str(ROOT / "samples/aged-reformer.thalweg")
    _, out, _ = run(capsys, "settle", path, "--json", "--reactions")
    last = json.loads(out)["cases"][-1]
    inert, approach = last["proof"]["restrictions"]
    assert set(inert) == {"field", "text", "cost", "cost_is"}
    assert inert["field"] == "restrictions[0]"
    assert approach["cost"] > inert["cost"] > 0
    assert approach["cost_is"] == "Gibbs energy"
    view = last["reactions"]
    assert set(view) == {"own", "list", "missing", "unexplained", "left_out"}
    assert view["own"] is True
    first = view["list"][0]
    assert set(first) == {
        "equation", "numbers", "extent", "ln_k", "ln_q", "q_over_k", "dh", "ds", "dg", "dcp",
        "dh298", "ds298", "dg298", "t_eq", "approach", "notes",
    }  # fmt: skip
    assert first["numbers"] == {"CH4": -1, "H2O": -1, "CO": 1, "H2": 3}
    assert first["approach"] == pytest.approx(38.0, abs=1e-6)
    assert first["t_eq"] == pytest.approx(last["T"] - 38.0, abs=1e-6)


def test_json_holds_no_infinity_and_the_table_no_gap_where_nothing_can_react(save, capsys):
    path = save(project(T=q(300, "K")))
    _, out, _ = run(capsys, "settle", path, "--json", "--reactions")
    assert "Infinity" not in out
    assert "NaN" not in out
    code, out, _ = run(capsys, "settle", path, "--reactions")
    assert code == 0
    assert "none: nothing that is there can turn into another" in out


def test_a_wrong_field_is_named_on_one_line_each(save, capsys):
    bad = project(name="Bad", amount=-3.0, T=q(0, "K"))
    code, out, err = run(capsys, "settle", save(project(name="Good", T=q(900, "K")), bad))
    assert code == 2
    assert "Good" in out, "the other case is answered all the same"
    lines = err.splitlines()
    assert len(lines) == 2
    assert lines[0].startswith("thalweg: plant.thalweg, Bad, streams[0].amounts[0].value: ")
    assert "negative" in lines[0]
    assert "fixed.T: " in lines[1]


def test_no_end_state_is_code_3_and_bad_input_outweighs_it(save, capsys):
    cold = project(pair="H,p", heat=q(-1, "MJ"), name="Cold")
    code, _, err = run(capsys, "settle", save(cold))
    assert code == 3
    assert len(err.splitlines()) == 1
    assert "fixed.heat" in err
    code, _, err = run(capsys, "settle", save(project(amount=-1.0, name="Bad"), cold))
    assert code == 2
    assert len(err.splitlines()) == 2


def test_errors_are_part_of_the_json(save, capsys):
    path = save(project(amount="abc", name="Bad"), project(pair="H,p", heat=q(-1, "MJ")))
    code, out, _ = run(capsys, "settle", path, "--json")
    assert code == 2
    first, second = json.loads(out)["cases"]
    assert first["error"]["kind"] == "input"
    assert first["error"]["faults"][0]["field"] == "streams[0].amounts[0].value"
    assert first["error"]["faults"][0]["value"] == "abc"
    assert second["error"]["kind"] == "no end state"


@pytest.mark.parametrize(
    ("name", "data", "text"),
    [
        ("empty.thalweg", b"", "empty"),
        ("binary.thalweg", bytes(range(256)) * 20, "no Thalweg project"),
        ("image.png", b"\x89PNG\r\n\x1a\n\x00\x00", "no Thalweg project"),
        ("cut.thalweg", (ROOT / "samples/lime-kiln.thalweg").read_bytes()[:700], "breaks off"),
        ("newer.thalweg", b'{"format": "thalweg-project", "version": 99}', "newer"),
        ("other.thalweg", b'{"name": "something else"}', "no Thalweg project"),
    ],
)
def test_files_that_are_no_project(tmp_path, capsys, name, data, text):
    path = tmp_path / name
    path.write_bytes(data)
    code, out, err = run(capsys, "settle", str(path))
    assert code == 2
    assert out == ""
    assert len(err.splitlines()) == 1
    assert text in err
    assert name in err
    assert path.read_bytes() == data


def test_names_cannot_reach_the_terminal_as_commands(save, capsys):
    path = save(project(name="a\nb\x1b[31m[bold]c", T=q(900, "K")))
    _, out, _ = run(capsys, "settle", path)
    assert "\x1b" not in out
    assert "a b [31m[bold]c" in out
    _, _, err = run(capsys, "settle", save(project(name="a\nb\x1b[31m", amount=-1.0)))
    assert "\x1b" not in err
    assert len(err.splitlines()) == 1


@pytest.mark.parametrize(
    "words",
    [
        ["settle"],
        ["settle", "/nowhere/at/all.thalweg"],
        ["settle", "/"],
        ["settle", "a", "b"],
        ["settle", "--nonsense"],
        ["nonsense"],
        ["species"],
        ["species", "zzzzzz"],
        ["species", ""],
    ],
)
def test_wrong_words_are_code_2_and_one_line(words, capsys):
    code, out, err = run(capsys, *words)
    assert code == 2
    assert out == ""
    assert len(err.splitlines()) == 1
    assert err.startswith("thalweg: ")


@pytest.mark.parametrize("words", [["--help"], ["settle", "--help"], ["species", "-h"], []])
def test_help_is_on_standard_output(words, capsys):
    code, out, err = run(capsys, *words)
    assert (code, err) == (0, "")
    assert "Usage: thalweg" in out


def test_help_has_examples_that_work(capsys):
    _, out, _ = run(capsys, "settle", "--help")
    named = {word for word in out.split() if word.startswith("samples/")}
    assert named
    for word in named:
        assert (ROOT / word).is_file()


def test_species_says_what_is_known_and_whence(capsys):
    code, out, _ = run(capsys, "species", "carbon dioxide")
    assert code == 0
    assert out.startswith("CO2 ")
    for word in ("CO₂", "gas", "6000 K", "−393.47", "uncertainty", "source", "second source"):
        assert word in out


def test_species_lists_what_a_text_may_mean(capsys):
    code, out, _ = run(capsys, "species", "C5H12O")
    assert code == 0
    assert out.count("C5H12O") > 2


def test_an_unknown_species_names_near_ones(capsys):
    code, out, err = run(capsys, "species", "methanl")
    assert (code, out) == (2, "")
    assert "CH3OH" in err


def test_runs_as_a_module_without_qt_and_into_a_closed_pipe():
    command = f"{sys.executable} -m solver.cli settle samples/sealed-deflagration.thalweg | head -1"
    done = subprocess.run(
        ["bash", "-o", "pipefail", "-c", command], capture_output=True, text=True, cwd=ROOT,
        check=False, env={**os.environ, "PYTHONWARNINGS": "error"},
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""
    code = (
        "import sys; import solver.cli; solver.cli.main(['species', 'CO2']);"
        "sys.exit(any(m.startswith(('PySide6', 'pyqtgraph')) for m in sys.modules))"
    )
    assert (
        subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True).returncode == 0
    )


def test_a_terminal_without_greek_gets_question_marks_and_no_failure():
    done = subprocess.run(
        [sys.executable, "-m", "solver.cli", "species", "CO2"], capture_output=True, cwd=ROOT,
        env={**os.environ, "PYTHONIOENCODING": "ascii"}, check=False,
    )  # fmt: skip
    assert done.returncode == 0
    assert done.stdout.startswith(b"CO2")
