"""Restrictions under an equation of state: each holds, costs energy, and the rest is settled."""

from __future__ import annotations

import numpy as np
import pytest

import solver
from solver.gas.fluid import make_fluid
from solver.gas.properties import ln_phi
from solver.reactions import Reaction
from species_db import R
from tests.solver.mixtures import library
from tests.solver.peers.problems import pure_potentials
from tests.solver.real.mixtures import BY_NAME, MIXTURES, RealMixture, settled

both = pytest.mark.parametrize("gas", ["srk", "pr"])

KEYS = ("CO", "CO2", "H2", "CH3OH", "H2O", "CH4", "N2")
FEED = {"CO": 1.0, "CO2": 0.5, "H2": 3.0, "CH4": 0.4, "N2": 0.3}
T, P = 480.0, 8.0e6


def settle(gas: str, *restrictions, T: float = T, p: float = P) -> solver.EndState:
    species = [library()[key] for key in KEYS]
    fixed = solver.Fixed("T,p", T=T, p=p)
    return solver.settle(species, FEED, fixed, gas=gas, restrictions=restrictions)


def ln_Q(end: solver.EndState, numbers: dict[str, int]) -> float:
    """ln of the fugacity quotient, worked out from the amounts in the gas."""
    fluid = make_fluid([library()[key] for key in KEYS], end.gas)
    n = np.array([end.fluids["gas"][key] for key in KEYS])
    log_phi = ln_phi(fluid, np.array([end.T]), np.array([end.p]), n[None, :])[0]
    ln_f = np.log(n / n.sum() * end.p / 1e5) + log_phi
    return sum(nu * ln_f[KEYS.index(key)] for key, nu in numbers.items())


def ln_K(numbers: dict[str, int], T: float) -> float:
    return -sum(nu * library()[key].g(T) for key, nu in numbers.items()) / (R * T)


METHANOL = {"CO": -1, "H2": -2, "CH3OH": 1}
SHIFT = {"CO": -1, "H2O": -1, "CO2": 1, "H2": 1}


@both
def test_methane_is_kept_and_the_rest_settled(gas: str):
    """Free, all would be methane; with methane inert the synthesis is what is left."""
    free, end = settle(gas), settle(gas, solver.Inert("CH4"))
    assert end.amounts["CH4"] == pytest.approx(FEED["CH4"], rel=1e-13)
    assert end.G > free.G
    assert free.amounts["CH4"] > 1.0
    for numbers in (METHANOL, SHIFT):
        assert ln_Q(end, numbers) == pytest.approx(ln_K(numbers, T), abs=1e-9)
    assert [cost.energy for cost in end.proof.restrictions] == pytest.approx(
        [end.G - free.G], rel=1e-9
    )


@both
@pytest.mark.parametrize("T", [405.0, 480.0])
def test_fixed_conversion_holds(gas: str, T: float):
    held = (solver.Inert("CH4"), solver.FixedConversion("CO", 0.37))
    end = settle(gas, *held, T=T)
    assert end.amounts["CO"] == pytest.approx(0.63 * FEED["CO"], rel=1e-12)
    assert all(cost.energy > 0.0 for cost in end.proof.restrictions)
    # carbon dioxide still makes methanol by the reaction that leaves CO alone
    numbers = {"CO2": -1, "H2": -3, "CH3OH": 1, "H2O": 1}
    assert ln_Q(end, numbers) == pytest.approx(ln_K(numbers, T), abs=1e-9)


@both
def test_conversion_of_the_free_state_changes_nothing(gas: str):
    kept = solver.Inert("CH4")
    free = settle(gas, kept)
    x = 1.0 - free.amounts["CO"] / FEED["CO"]
    end = settle(gas, kept, solver.FixedConversion("CO", x))
    for key in KEYS:
        assert end.amounts[key] == pytest.approx(free.amounts[key], rel=1e-6, abs=1e-9)
    assert abs(end.proof.restrictions[1].energy) <= 1e-7 * R * T


@both
@pytest.mark.parametrize("dT", [-25.0, 0.0, 12.0])
def test_reaction_held_at_an_approach(gas: str, dT: float):
    """The fugacity quotient is K at T + dT; the shift beside it is at K of T."""
    numbers = {library()[key]: nu for key, nu in METHANOL.items()}
    held = solver.HeldApproach(Reaction(numbers), dT, key="CH3OH")
    end = settle(gas, solver.Inert("CH4"), held)
    assert ln_Q(end, METHANOL) == pytest.approx(ln_K(METHANOL, T + dT), abs=1e-9)
    assert ln_Q(end, SHIFT) == pytest.approx(ln_K(SHIFT, T), abs=1e-9)


@both
def test_groups_that_do_not_exchange(gas: str):
    """Nitrogen and hydrogen beside methanol synthesis gas: no hydrogen is shared."""
    keys = ("N2", "H2", "NH3", "CO", "CO2", "CH3OH", "H2O")
    species = [library()[key] for key in keys]
    feed = {"CO": 1.0, "H2O": 0.6, "N2": 1.0, "NH3": 0.8}
    group = solver.NoExchange({"N2", "NH3"})
    fixed = solver.Fixed("T,p", T=520.0, p=1.0e7)
    end = solver.settle(species, feed, fixed, gas=gas, restrictions=[group])
    assert end.amounts["NH3"] == pytest.approx(0.8, rel=1e-12)
    assert end.amounts["N2"] == pytest.approx(1.0, rel=1e-12)
    carbon = sum(end.amounts[key] for key in ("CO", "CO2", "CH3OH"))
    assert carbon == pytest.approx(1.0, rel=1e-12)
    assert end.proof.restrictions[0].energy > 0.0


@both
@pytest.mark.parametrize("T", [255.0, 300.0, 420.0])
def test_nothing_reacts_and_the_heat_balance_closes(gas: str, T: float):
    """All inert: the settled state is the mixture as fed, with its liquid where there is one."""
    feed = {"H2": 2.0, "N2": 1.0, "NH3": 3.0}
    species = [library()[key] for key in feed]
    inert = [solver.Inert(key) for key in feed]
    fixed = solver.Fixed("T,p", T=T, p=4.0e6)
    end = solver.settle(species, feed, fixed, gas=gas, restrictions=inert)
    check_as_fed(end, {library()[key]: n for key, n in feed.items()}, gas)
    assert ("liquid" in end.fluids) is (T < 350.0)


@pytest.mark.parametrize(
    "name", ["hydrocarbons and water", "methane and propane", "water alone", "steam alone"]
)
def test_what_cannot_react_is_as_fed(name: str):
    """Gas, one liquid or two: the same mixture by both doors."""
    real: RealMixture = BY_NAME[name]
    check_as_fed(settled(real), real.feed, real.gas)


def check_as_fed(end: solver.EndState, feed, gas: str) -> None:
    fed = solver.as_fed(feed, T=end.T, p=end.p, gas=gas)
    unit = R * end.T * sum(end.amounts.values())
    assert pytest.approx(end.V, rel=1e-9) == fed.V
    for name in ("H", "U", "G"):
        assert abs(getattr(fed, name) - getattr(end, name)) <= 1e-9 * unit, name
    assert abs(fed.S - end.S) <= 1e-9 * unit / end.T


@both
@pytest.mark.parametrize("T", [280.0, 298.15, 420.0])
def test_fed_liquid_water_neither_warms_nor_cools_by_itself(gas: str, T: float):
    water, liquid = library()["H2O"], library()["H2O(l)"]
    fed = solver.as_fed({liquid: 1.0}, T=T, p=2.0e6, gas=gas)
    fixed = solver.Fixed("H,p", H=fed.H, p=2.0e6)
    end = solver.settle([water, liquid], {liquid: 1.0}, fixed, gas=gas)
    assert pytest.approx(T, abs=1e-6) == end.T


@pytest.mark.parametrize("real", MIXTURES, ids=str)
def test_thin_gas_becomes_ideal(real: RealMixture):
    """H and V differ from the ideal answer by what falls as p, amounts by less than ln phi."""
    T = max(real.T, 400.0)
    off = []
    for p in (4.0e3, 4.0e2):
        fixed = solver.Fixed("T,p", T=T, p=p)
        mine = solver.settle(real.species, real.feed, fixed, gas=real.gas)
        ideal = solver.settle(real.species, real.feed, fixed)
        assert set(mine.fluids) == {"gas"}
        n = sum(ideal.amounts.values())
        gases = [s for s in real.species if s.phase == "gas"]
        held = np.array([[mine.amounts[s.key] for s in gases]])
        fluid = make_fluid(gases, real.gas)
        largest = np.abs(ln_phi(fluid, np.array([T]), np.array([p]), held)).max()
        assert largest <= 3e-7 * p
        worst = max(abs(mine.amounts[k] - ideal.amounts[k]) for k in ideal.amounts)
        assert worst <= largest * n
        off.append((abs(mine.H - ideal.H) / (n * R * T), abs(mine.V / ideal.V - 1.0)))
    for thick, thin in zip(*off, strict=True):
        assert thick <= 1e-3
        assert thin <= 0.2 * thick


def test_potentials_of_pure_species_are_the_libraries():
    """What the checks here lean on."""
    s = library()["CO2"]
    assert pure_potentials([s], 500.0, 1e5)[0] == pytest.approx(s.g(500.0) / (R * 500.0))
