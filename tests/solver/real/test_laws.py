"""Laws of equilibrium that hold for every real mixture, so that no stored number is needed."""

from __future__ import annotations

import numpy as np
import pytest

import solver
from tests.solver.real.figures import SURE, Array, Figures
from tests.solver.real.mixtures import MIXTURES, RealMixture, settled

every_mixture = pytest.mark.parametrize("real", MIXTURES, ids=str)


@every_mixture
def test_phases_are_as_expected(real: RealMixture):
    """What these mixtures are in the list for."""
    assert ", ".join(settled(real).fluids) == real.fluids


@every_mixture
def test_elements_close(real: RealMixture):
    end = settled(real)
    every = sorted({e for s in end.species for e in s.elements})
    fed = {e: sum(n * s.elements.get(e, 0.0) for s, n in real.feed.items()) for e in every}
    held = {e: sum(end.amounts[s.key] * s.elements.get(e, 0.0) for s in end.species) for e in every}
    assert min(end.amounts.values()) >= 0.0
    for e in every:
        assert abs(held[e] - fed[e]) <= 1e-12 * max(fed.values())
        assert abs(held[e] - fed[e]) <= 1e-9 * fed[e]
    off = max(abs(held[e] - fed[e]) for e in every) / max(fed.values())
    assert end.proof.element_residual == pytest.approx(off, abs=1e-13)


@every_mixture
def test_phases_add_up_to_the_amounts(real: RealMixture):
    end = settled(real)
    for s in end.species:
        parts = sum(held.get(s.key, 0.0) for held in end.phases.values())
        assert parts == pytest.approx(end.amounts[s.key], rel=1e-14, abs=0.0)
    assert sum(end.phase_amounts.values()) == pytest.approx(sum(end.amounts.values()), rel=1e-13)


@every_mixture
def test_one_set_of_element_potentials_explains_every_phase(real: RealMixture):
    """ln(y phi p/p0) + g = a.lambda in each fluid phase, from the fugacity coefficients alone."""
    figures = Figures(settled(real))
    assert figures.phases
    for n in figures.phases.values():
        off = figures.off_fluid(n)
        sure = n > SURE * figures.total
        assert np.abs(off[sure]).max() <= 1e-8
        seen = n > 1e-250
        assert np.abs(off[seen]).max() <= 1e-6  # traces: as far as the rest fixes the potentials
        # each species weighted by its amount
        assert n @ np.abs(np.where(n > 0.0, off, 0.0)) <= 1e-11 * figures.total
    for s, amount, off in zip(
        figures.condensed, figures.solids, figures.off_condensed, strict=True
    ):
        if amount > 0.0:
            assert abs(off) <= 1e-8
        else:
            assert off >= -1e-8
            assert figures.end.proof.absent[s.key] == pytest.approx(np.exp(-off), rel=1e-6)


@every_mixture
def test_proof_is_within_its_limits(real: RealMixture):
    proof = settled(real).proof
    assert proof.element_residual <= 1e-12
    assert proof.energy_residual == 0.0
    assert abs(proof.gap) <= 1e-9
    assert proof.stationarity is not None
    assert proof.stationarity <= 1e-9
    assert proof.tangent_distance is not None
    assert proof.tangent_distance >= -1e-9
    assert proof.starts > 0
    assert not proof.rigorous


@every_mixture
def test_no_other_amounts_have_a_lower_gibbs_energy(real: RealMixture):
    """Two hundred moves: along reactions, between phases, and into a new phase of any kind."""
    figures = Figures(settled(real))
    names = list(figures.phases)
    start = [figures.phases[name] for name in names]
    roots = ["least"] * len(names)
    lowest = figures.above(list(zip(start, roots, strict=True)), figures.solids)
    assert abs(lowest) <= 1e-11 * figures.total
    rng = np.random.default_rng(29)
    A = np.concatenate(
        [*[figures.formulas(figures.gases)] * len(start), figures.formulas(figures.condensed)]
    )
    tried = 0
    while tried < 200:
        fluids = [n.copy() for n in start]
        kinds, solids = list(roots), figures.solids.copy()
        way = tried % 3
        share = 10.0 ** rng.uniform(-5.0, -0.1)
        if way == 0:
            fluids, solids = along_reactions(figures, A, fluids, solids, share, rng)
        elif way == 1 and len(fluids) > 1:
            a, b = rng.permutation(len(fluids))[:2]
            moved = share * fluids[a] * rng.uniform(0.0, 1.0, len(fluids[a]))
            fluids[a], fluids[b] = fluids[a] - moved, fluids[b] + moved
        else:
            a = int(rng.integers(len(fluids)))
            some = rng.uniform(0.0, 1.0, len(fluids[a])) ** float(rng.choice([0.1, 1.0, 8.0]))
            moved = share * fluids[a] * some
            fluids[a] = fluids[a] - moved
            fluids.append(moved)
            kinds.append(str(rng.choice(["least", "vapour", "liquid"])))
        there = figures.above(list(zip(fluids, kinds, strict=True)), solids)
        assert there >= lowest - 1e-12 * figures.total, (way, share)
        tried += 1


def along_reactions(
    figures: Figures,
    A: Array,
    fluids: list[Array],
    solids: Array,
    share: float,
    rng: np.random.Generator,
) -> tuple[list[Array], Array]:
    """A step along what the balances leave free, each change in a phase drawn by lot."""
    n = np.concatenate([*fluids, solids])
    some = np.flatnonzero(n > 1e-9 * figures.total)
    some = some[rng.uniform(size=len(some)) < 0.8] if len(some) > 8 else some
    _, sizes, free = np.linalg.svd(A[some].T)
    free = free[int((sizes > 1e-10 * sizes[0]).sum()) :]
    if len(free):
        direction = rng.standard_normal(len(free)) @ free
        step = share * np.min(n[some] / np.maximum(np.abs(direction), 1e-30))
        n[some] += step * direction
    cut = np.cumsum([len(part) for part in fluids])
    *moved, solids = np.split(n, cut)
    return list(moved), solids


@every_mixture
def test_order_of_species_does_not_matter(real: RealMixture):
    end = settled(real)
    rng = np.random.default_rng(3)
    for _ in range(2):
        shuffled = [real.species[i] for i in rng.permutation(len(real.species))]
        fixed = solver.Fixed("T,p", T=real.T, p=real.p)
        other = solver.settle(shuffled, real.feed, fixed, gas=real.gas)
        same(end, other, 1.0)


@every_mixture
@pytest.mark.parametrize("size", [1e-6, 1e6])
def test_size_of_the_feed_does_not_matter(real: RealMixture, size: float):
    same(settled(real), real.settle(size=size), size)


def same(end: solver.EndState, other: solver.EndState, size: float) -> None:
    """Phase by phase, and in every total."""
    total = sum(end.amounts.values())
    assert list(end.phases) == list(other.phases)
    for name, held in end.phases.items():
        for key, amount in held.items():
            assert abs(amount - other.phases[name][key] / size) <= 1e-10 * total, (name, key)
    for name in ("V", "H", "U", "S", "G"):
        assert getattr(other, name) / size == pytest.approx(getattr(end, name), rel=1e-9)


@every_mixture
def test_energies_fit_together(real: RealMixture):
    end = settled(real)
    assert pytest.approx(end.H - end.T * end.S, rel=1e-12) == end.G
    assert pytest.approx(end.H - end.p * end.V, rel=1e-12) == end.U
    figures = Figures(end)
    b = np.array([sum(n * s.elements.get(e, 0.0) for s, n in real.feed.items())
                  for e in figures.elements])  # fmt: skip
    own = float(b @ figures.lagrange) * 8.314462618 * end.T
    assert pytest.approx(own, rel=1e-10) == end.G


@every_mixture
def test_gibbs_energy_falls_with_S_and_rises_with_V(real: RealMixture):
    """dG = -S dT + V dp at the minimum, where amounts may be held (envelope theorem)."""
    end = settled(real)
    T, p, step = real.T, real.p, 2e-5

    def G(T: float, p: float) -> float:
        return real.settle(T=T, p=p).G

    by_T = (G(T * (1 + step), p) - G(T * (1 - step), p)) / (2 * step * T)
    assert -by_T == pytest.approx(end.S, rel=1e-6)
    step = 1e-3
    near = (G(T, p * (1 + step)) - G(T, p * (1 - step))) / (2 * step * p)
    far = (G(T, p * (1 + 2 * step)) - G(T, p * (1 - 2 * step))) / (4 * step * p)
    by_p = (4 * near - far) / 3
    assert by_p == pytest.approx(end.V, rel=1e-6, abs=1e-11 * abs(end.G) / p)


@every_mixture
def test_a_pure_liquid_is_never_beside_its_fluid_liquid(real: RealMixture):
    end = settled(real)
    modelled = {s.cas for s in end.species if s.phase == "gas" and s.key not in end.taken_as_ideal}
    for s in end.species:
        if s.phase == "liquid" and s.cas in modelled:
            assert s.key in end.left_out
            assert end.amounts[s.key] == 0.0
            assert s.key in end.proof.model
        else:
            assert s.key not in end.left_out
