"""Bad input at the doors of real gases: settled or refused, with the field and a sentence."""

from __future__ import annotations

import dataclasses
import math

import pytest

import solver
from tests.solver.mixtures import library

KEYS = ("H2", "N2", "NH3")
FEED = {"H2": 3.0, "N2": 1.0}
FIXED = solver.Fixed("T,p", T=700.0, p=1.0e7)
both = pytest.mark.parametrize("gas", ["srk", "pr"])

DOORS = {
    "settle": lambda species, gas: solver.settle(species, FEED, FIXED, gas=gas),
    "settle_many": lambda species, gas: solver.settle_many(
        species, FEED, "T,p", [700.0, 710.0], 1.0e7, gas=gas
    ),
    "as_fed": lambda species, gas: solver.as_fed(
        dict.fromkeys(species, 1.0), T=700.0, p=1.0e7, gas=gas
    ),
}
every_door = pytest.mark.parametrize("door", DOORS)


def species(**own) -> list:
    """The candidates; with values, ammonia is a record of the user's own that has them."""
    found = [library()[key] for key in KEYS]
    if own:
        found[-1] = dataclasses.replace(found[-1], source="user", **own)
    return found


def refused(door: str, species_: list, gas) -> solver.InputError:
    with pytest.raises(solver.InputError) as caught:
        DOORS[door](species_, gas)
    assert len(str(caught.value)) > 30
    assert caught.value.allowed
    return caught.value


@every_door
@pytest.mark.parametrize("gas", ["vdw", "SRK", "", None, 3])
def test_unknown_gas_model(door: str, gas):
    error = refused(door, species(), gas)
    assert error.field == "gas"
    assert error.value == gas
    assert all(name in str(error) for name in ("ideal", "srk", "pr"))


@every_door
@both
@pytest.mark.parametrize("k", [1.2, -1.01, math.nan, math.inf])
def test_interaction_beyond_one(door: str, gas: str, k: float):
    def model() -> solver.GasModel:
        return solver.GasModel(gas, (("H2", "N2", k),))

    with pytest.raises(solver.InputError, match=r"H2.*N2") as caught:
        DOORS[door](species(), model())
    assert caught.value.field == "interactions"


@pytest.mark.parametrize("k", ["a tenth", None])
def test_interaction_that_is_no_number(k):
    with pytest.raises(solver.InputError) as caught:
        DOORS["settle"](species(), solver.GasModel("pr", (("H2", "N2", k),)))
    assert caught.value.field == "interactions"


@both
@pytest.mark.parametrize(
    ("pairs", "word"),
    [
        ((("H2", "H2", 0.1),), "itself"),
        ((("H2", "Xe", 0.1),), "Xe"),
        ((("H2", "N2", 0.1), ("N2", "H2", 0.2)), "one of them"),
    ],
)
def test_interaction_that_cannot_be(gas: str, pairs, word: str):
    error = refused("settle", species(), solver.GasModel(gas, pairs))
    assert error.field == "interactions"
    assert word in str(error)


@both
def test_interactions_at_their_ends_are_settled(gas: str):
    for k in (-1.0, 1.0):
        end = DOORS["settle"](species(), solver.GasModel(gas, (("H2", "N2", k),)))
        assert end.proof.holds


def test_ideal_gas_has_no_interactions():
    with pytest.raises(solver.InputError) as caught:
        solver.GasModel("ideal", (("H2", "N2", 0.1),))
    assert caught.value.field == "interactions"


@every_door
@both
@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("Tc", -5.0), ("Tc", 0.0), ("Tc", 5000.0), ("Tc", math.nan), ("Tc", math.inf),
        ("pc", 0.0), ("pc", -1e6), ("pc", 1e9), ("acentric", 9.0), ("acentric", math.nan),
    ],
)  # fmt: skip
def test_absurd_critical_constants_of_the_users_own(door: str, gas: str, name: str, value: float):
    error = refused(door, species(**{name: value}), gas)
    assert error.field == f"species[NH3].{name}"
    assert "NH3" in str(error)


@both
def test_missing_critical_constants_are_settled_and_said(gas: str):
    end = solver.settle(species(Tc=None, pc=None), FEED, FIXED, gas=gas)
    assert end.taken_as_ideal == ("NH3",)
    assert any("NH3" in text for text in end.cautions)
    assert end.proof.holds


@both
@pytest.mark.parametrize(
    ("pair", "held"),
    [
        ("T,V", {"T": 700.0, "V": 1e-5}),
        ("T,V", {"T": 700.0, "V": 3e-5}),
        ("U,V", {"U": 1e4, "V": 1e-5}),
        ("S,V", {"S": 500.0, "V": 1e-5}),
    ],
)
def test_vessel_smaller_than_the_molecules(gas: str, pair: str, held: dict[str, float]):
    """Two moles of ammonia have a covolume of 4.6e-5 to 5.2e-5 m3."""
    with pytest.raises(solver.SettleError) as caught:
        solver.settle(species(), FEED, solver.Fixed(pair, **held), gas=gas)
    assert caught.value.field == "fixed.V"
    assert "leave out candidates" not in str(caught.value)


@both
def test_vessel_smaller_than_the_molecules_in_a_batch(gas: str):
    ends = solver.settle_many(species(), FEED, "T,V", 700.0, [1e-5, 1e-2], gas=gas)
    assert ends.settled.tolist() == [False, True]
    assert "V" in ends.why[0]


@both
@pytest.mark.parametrize("T", [150.0, 700.0, 20_000.0])
@pytest.mark.parametrize("p", [1e-7, 1.0, 1e9, 1e10, 1e11])
def test_ends_of_the_allowed_range(gas: str, T: float, p: float):
    fixed = solver.Fixed("T,p", T=T, p=p)
    end = solver.settle(species(), FEED, fixed, gas=gas)
    assert end.proof.holds
    assert end.proof.stationarity <= 1e-9
    if T > 3000.0:
        assert "liquid" not in end.fluids
    if p > 1e8:
        assert end.cautions


@both
@pytest.mark.parametrize("T", [150.0, 300.0, 20_000.0])
@pytest.mark.parametrize("p", [1e-7, 1e9, 1e11])
def test_ends_of_the_allowed_range_with_condensed_phases(gas: str, T: float, p: float):
    found = [library()[k] for k in "H2O CO2 H2 CO O2 CH4 H2O(l) C(gr)".split()]
    fixed = solver.Fixed("T,p", T=T, p=p)
    end = solver.settle(found, {"H2O": 1.0, "CO": 1.0}, fixed, gas=gas)
    assert end.proof.holds
    if T > 3000.0:
        assert "liquid" not in end.fluids


@pytest.mark.parametrize(("name", "value"), [("T", 149.0), ("T", 2.1e4), ("p", 9e-8), ("p", 2e11)])
def test_beyond_the_allowed_range(name: str, value: float):
    with pytest.raises(solver.InputError) as caught:
        solver.Fixed("T,p", **({"T": 700.0, "p": 1e7} | {name: value}))
    assert caught.value.field == f"fixed.{name}"
