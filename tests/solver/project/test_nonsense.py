"""Whatever stands in a file or a field, the answer is a sentence and never another failure."""

import contextlib
import copy
import json
import os
import random
from pathlib import Path

import pytest

from solver.errors import InputError
from solver.project import file, units
from solver.project.case import CaseFaults, prepare
from solver.project.unit_table import KINDS, UNIONS

SAMPLES = sorted((Path(__file__).parents[3] / "samples").glob("*.thalweg"))
ROUNDS = 40 * int(os.environ.get("THALWEG_FUZZ", "1"))
NASTY = [
    None, True, False, 0, -1, 1e-300, 1e300, 10**30, "", " ", "abc", "1,5", "1,500", "-3", "NaN",
    "∞", "\x00", "é" * 50, [], {}, [[]], {"value": 1}, "mol", "mol %", "kg/h", "Nm3", "barg",
    "degC", "K/K", "m**2", "H2O", "H2O(l)", "C(gr)", "e-", "H+", "U,V", "S,V", "listed", "all",
    "xyzzy",
]  # fmt: skip


def _leaves(node, path=()):
    yield path
    items = (
        node.items()
        if isinstance(node, dict)
        else enumerate(node)
        if isinstance(node, list)
        else ()
    )
    for key, value in items:
        yield from _leaves(value, (*path, key))


def _spoil(document, rng):
    """Replace, drop or double one part of a document."""
    spoilt = copy.deepcopy(document)
    path = rng.choice([p for p in _leaves(spoilt) if p])
    inner = spoilt
    for part in path[:-1]:
        inner = inner[part]
    way = rng.random()
    if way < 0.7:
        inner[path[-1]] = rng.choice(NASTY)
    elif way < 0.85:
        del inner[path[-1]]
    elif isinstance(inner, list):
        inner.append(copy.deepcopy(inner[path[-1]]))
    return spoilt


@pytest.mark.parametrize("path", SAMPLES, ids=lambda p: p.stem)
def test_a_spoilt_file_is_read_or_refused_in_words(path):
    rng = random.Random(path.stem)
    document = json.loads(path.read_text("utf-8"))
    said: list[str] = []
    found: list[InputError] = []
    for _ in range(ROUNDS):
        spoilt = _spoil(document, rng)
        try:
            project = file.parse(json.dumps(spoilt).encode(), "x.thalweg")
        except file.ProjectFileError as error:
            said.append(str(error))
            continue
        assert file.parse(file.text_of(project).encode()) == project
        for case in project.cases:
            try:
                prepare(case)
            except CaseFaults as faults:
                found += faults.faults
    assert all(isinstance(fault, InputError) and fault.field for fault in found)
    said += [str(fault) for fault in found]
    assert len(said) > ROUNDS / 10
    for text in said:
        assert "\n" not in text
        assert text.endswith((".", "?"))


def test_cut_and_flipped_bytes_are_refused_in_words():
    rng = random.Random(1)
    data = SAMPLES[0].read_bytes()
    for _ in range(ROUNDS):
        cut = data[: rng.randrange(len(data) - 2)]
        with pytest.raises(file.ProjectFileError):
            file.parse(cut)
        flipped = bytearray(data)
        flipped[rng.randrange(len(data))] ^= 1 << rng.randrange(8)
        with contextlib.suppress(file.ProjectFileError):
            file.parse(bytes(flipped))


def test_texts_of_a_field_are_read_or_refused_in_words():
    rng = random.Random(2)
    letters = "0123456789.,-+eE×⁻⁵ %°CKFbargkmolNh3/()*^·µ\u2212\u00a0\u202f\n\tπ_'\"\\"
    kinds = [*KINDS, *UNIONS]
    refused = []
    for _ in range(20 * ROUNDS):
        text = "".join(rng.choices(letters, k=rng.randrange(1, 14)))
        kind = rng.choice(kinds)
        try:
            quantity = units.parse_quantity(text, kind)
        except units.UnitError as error:
            refused.append(str(error))
            continue
        again = units.parse_quantity(f"{units.typed_number(quantity.value)} {quantity.unit}", kind)
        assert again.value == pytest.approx(quantity.value, rel=1e-14)
        assert units.to_si(again, kind) == pytest.approx(units.to_si(quantity, kind))
    assert 0 < len(refused) < 20 * ROUNDS
    assert not any("\n" in text for text in refused)
