"""Binary interaction parameters: the shipped table, and what a user may put over it."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
import thermo

from solver.errors import InputError
from solver.gas.interactions import published
from tests.solver.gas.states import fluid_of, library

KEYS = ("N2", "H2", "NH3", "OH")


def test_table_is_what_its_source_holds():
    """Every shipped value against the data set the package `thermo` carries, by CAS number."""
    where = Path(thermo.__file__).parent / "Interaction Parameters" / "ChemSep" / "pr.json"
    data = json.loads(where.read_text("utf-8"))["data"]
    source = {frozenset(cas.split()): row["kij"] for cas, row in data.items()}
    lib = library()
    table = published("pr")
    for pair in table.values():
        assert lib[pair.a].phase == lib[pair.b].phase == "gas"
        assert pair.k == source[frozenset((lib[pair.a].cas, lib[pair.b].cas))], (pair.a, pair.b)
        assert "page" in pair.source
    known = {frozenset((lib[pair.a].cas, lib[pair.b].cas)) for pair in table.values()}
    gases = {sp.cas for sp in lib.values() if sp.phase == "gas" and sp.Tc is not None}
    left_out = {names for names in source if names <= gases} - known
    assert all(abs(source[names]) > 0.3 for names in left_out)
    assert len(table) == len(known) > 100


def test_no_table_for_soave_redlich_kwong():
    assert not published("srk")
    fluid = fluid_of(("N2", "H2", "NH3"), "srk")
    assert fluid.k == ()
    assert fluid.assumed == (("N2", "H2"), ("N2", "NH3"), ("H2", "NH3"))


def test_what_is_known_and_what_is_assumed():
    fluid = fluid_of(KEYS, "pr")
    assert [(pair.a, pair.b, pair.k) for pair in fluid.k] == [
        ("N2", "H2", 0.0711),
        ("N2", "NH3", 0.2193),
    ]
    assert fluid.assumed == (("H2", "NH3"),)


def test_own_value_stands_over_the_table():
    fluid = fluid_of(KEYS, "pr", (("H2", "N2", 0.02), ("N2", "H2", 0.02)))
    first = fluid.k[0]
    assert (first.a, first.b, first.k, first.source) == ("N2", "H2", 0.02, "given by the user")
    assert fluid_of(KEYS, "pr", (("NH3", "H2", 0.0),)).assumed == ()


@pytest.mark.parametrize(
    ("pairs", "value", "says"),
    [
        ((("N2", "H2", 1.2),), 1.2, "outside -1 to 1"),
        ((("N2", "H2", float("nan")),), None, "outside -1 to 1"),
        ((("N2", "H2", float("-inf")),), float("-inf"), "outside -1 to 1"),
        ((("N2", "N2", 0.1),), ("N2", "N2", 0.1), "with itself"),
        ((("N2", "H2", 0.1), ("H2", "N2", 0.2)), (0.1, 0.2), "keep one of them"),
        ((("N2", "CO2", 0.1),), "CO2", "not among the gas candidates"),
        ((("OH", "N2", 0.1),), "OH", "critical constants"),
    ],
)
def test_pairs_that_cannot_be(pairs, value, says):
    with pytest.raises(InputError, match=says) as caught:
        fluid_of(KEYS, "srk", pairs)
    assert caught.value.field == "interactions"
    assert caught.value.allowed
    if value is not None:
        assert caught.value.value == value


def test_unknown_equation():
    with pytest.raises(InputError, match="srk") as caught:
        fluid_of(KEYS, "cubic")
    assert (caught.value.field, caught.value.allowed) == ("gas", "srk, pr")
