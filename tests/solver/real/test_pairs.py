"""All six pairs and batches of real mixtures: whatever is held, the same states come back."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

import solver
from tests.solver.real.mixtures import BY_NAME, MIXTURES, RealMixture, settled

every_mixture = pytest.mark.parametrize("real", MIXTURES, ids=str)
every_pair = pytest.mark.parametrize("pair", sorted(set(solver.PAIRS) - {"T,p"}))


def held_by(end: solver.EndState, pair: str) -> dict[str, float]:
    return {name: getattr(end, name) for name in pair.split(",")}


def check_same_state(back: solver.EndState, end: solver.EndState) -> None:
    """T to 1e-8; p to 1e-8 of what a change of volume by as much does to it."""
    assert pytest.approx(end.T, rel=1e-8) == back.T
    assert pytest.approx(end.p, rel=1e-6) == back.p
    total = sum(end.amounts.values())
    assert list(back.phases) == list(end.phases)
    for name, held in end.phases.items():
        for key, amount in held.items():
            assert abs(back.phases[name][key] - amount) <= 1e-6 * total, (name, key)
    assert back.proof.energy_residual <= 1e-10
    for name in ("V", "H", "U", "S", "G"):
        assert getattr(back, name) == pytest.approx(getattr(end, name), rel=1e-7)


@every_pair
@every_mixture
def test_state_comes_back_from_any_pair(real: RealMixture, pair: str):
    end = settled(real)
    check_same_state(real.settle(pair, **held_by(end, pair)), end)


@every_pair
@pytest.mark.parametrize(("gas", "share"), [("srk", 0.03), ("pr", 0.5), ("srk", 0.97)])
def test_boiling_water_comes_back_from_any_pair(gas: str, share: float, pair: str):
    """A pure liquid with its vapour: T and p say nothing of how much has boiled."""
    real = BY_NAME["water alone"]
    fluids = solver.settle(
        real.species,
        real.feed,
        solver.Fixed("H,p", H=boiling(gas, 9.0e5, share), p=9.0e5),
        gas=gas,
    )
    assert fluids.phase_amounts["gas"] == pytest.approx(share, abs=1e-6)
    assert set(fluids.phases) == {"gas", "liquid"}
    fixed = solver.Fixed(pair, **held_by(fluids, pair))
    back = solver.settle(real.species, real.feed, fixed, gas=gas)
    check_same_state(back, fluids)


def boiling(gas: str, p: float, share: float) -> float:
    """Enthalpy with a share of one mole of water boiled, J."""
    liquid, vapour = plateau(gas, p)
    return (1 - share) * liquid + share * vapour


@cache
def plateau(gas: str, p: float) -> tuple[float, float]:
    """Enthalpy of one mole of water at both ends of its boiling, J."""
    real = BY_NAME["water alone"]

    def end(T: float) -> solver.EndState:
        return solver.settle(real.species, real.feed, solver.Fixed("T,p", T=T, p=p), gas=gas)

    low, high = 300.0, 600.0
    while high - low > 1e-10 * low:
        T = (low + high) / 2
        low, high = (T, high) if "liquid" in end(T).fluids else (low, T)
    return end(low).H, end(high).H


@every_mixture
def test_energy_and_entropy_rise_with_temperature(real: RealMixture):
    """Along a line at the mixture's pressure, through whatever phases come and go."""
    T = np.linspace(0.75 * real.T, 1.3 * real.T, 24)
    ends = solver.settle_many(real.species, real.feed, "T,p", T, real.p, gas=real.gas)
    assert ends.settled.all()
    assert (np.diff(ends.H) > 0.0).all()
    assert (np.diff(ends.S) > 0.0).all()
    assert (np.diff(ends.G) < 0.0).all() or not (ends.S > 0.0).all()


@every_mixture
def test_volume_falls_and_gibbs_energy_rises_with_pressure(real: RealMixture):
    p = real.p * np.geomspace(0.02, 30.0, 20)
    ends = solver.settle_many(real.species, real.feed, "T,p", real.T, p, gas=real.gas)
    assert ends.settled.all()
    assert (np.diff(ends.V) < 0.0).all()
    assert (np.diff(ends.G) > 0.0).all()
    # G is concave in p: each secant lies between the volumes at its ends
    secant = np.diff(ends.G) / np.diff(p)
    assert (secant <= ends.V[:-1] * (1 + 1e-9)).all()
    assert (secant >= ends.V[1:] * (1 - 1e-9)).all()


# every pair comes up with several mixtures, and T,p with all
SHARED_OUT = [
    (real, pair)
    for i, real in enumerate(MIXTURES)
    for pair in ("T,p", sorted(set(solver.PAIRS) - {"T,p"})[i % 5])
]


@pytest.mark.parametrize(("real", "pair"), SHARED_OUT, ids=str)
def test_batch_equals_single(real: RealMixture, pair: str):
    """Five cases around the mixture's T and p in one call, and each by itself."""
    T, p, feeds = scattered(real)
    ends = solver.settle_many(real.species, feeds, "T,p", T, p, gas=real.gas)
    assert ends.settled.all()
    first, second = (getattr(ends, name).copy() for name in pair.split(","))
    batch = solver.settle_many(real.species, feeds, pair, first, second, gas=real.gas)
    assert batch.settled.all(), batch.why
    for i in range(len(T)):
        feed = {s: float(n[i]) for s, n in feeds.items()}
        names = pair.split(",")
        fixed = solver.Fixed(pair, **{names[0]: first[i], names[1]: second[i]})
        one = solver.settle(real.species, feed, fixed, gas=real.gas)
        total = sum(one.amounts.values())
        assert batch.T[i] == pytest.approx(one.T, rel=1e-9)
        assert batch.p[i] == pytest.approx(one.p, rel=1e-7)
        for name in ("V", "H", "U", "S", "G"):
            assert getattr(batch, name)[i] == pytest.approx(getattr(one, name), rel=1e-8), name
        for key, amount in zip(batch.keys, batch.amounts[i], strict=True):
            assert abs(amount - one.amounts[key]) <= 1e-8 * total


def scattered(real: RealMixture):
    rng = np.random.default_rng(17)
    T = real.T * rng.uniform(0.9, 1.1, 5)
    p = real.p * rng.uniform(0.6, 1.6, 5)
    feeds = {s: n * rng.uniform(0.7, 1.3, 5) for s, n in real.feed.items()}
    return T, p, feeds


@pytest.mark.parametrize("gas", ["srk", "pr"])
def test_sealed_water_keeps_its_pressure_while_both_phases_last(gas: str):
    """T,V: between the volumes of liquid and vapour p does not depend on V."""
    real = BY_NAME["water alone"]
    V = np.geomspace(5e-5, 2e-3, 6)
    ends = solver.settle_many(real.species, real.feed, "T,V", 460.0, V, gas=gas)
    assert ends.settled.all()
    assert np.ptp(ends.p) <= 1e-9 * ends.p.mean()
    np.testing.assert_allclose(ends.V, V, rtol=1e-9)
    U_V = np.diff(ends.U) / np.diff(V)  # the lever rule
    np.testing.assert_allclose(U_V, U_V.mean(), rtol=1e-7)
