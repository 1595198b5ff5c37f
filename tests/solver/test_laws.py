"""Laws of equilibrium that hold for every mixture, so that no stored number is needed."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

import solver
import species_db
from species_db import Species
from tests.solver.mixtures import BY_NAME, MIXTURES, Mixture
from tests.solver.peers.problems import FUZZ, pure_potentials, random_problem

Vector = npt.NDArray[np.float64]

LIB = species_db.load()
every_mixture = pytest.mark.parametrize("mixture", MIXTURES, ids=str)
random_seeds = pytest.mark.parametrize("seed", range(1000, 1000 + 60 * FUZZ))


def settle_Tp(
    species: list[Species], feed: dict[Species, float], T: float, p: float
) -> solver.EndState:
    return solver.settle(species, feed, solver.Fixed("T,p", T=T, p=p))


def settled(mixture: Mixture) -> solver.EndState:
    return settle_Tp(mixture.species, mixture.feed_amounts, mixture.T, mixture.p)


def amounts(end: solver.EndState, species: list[Species]) -> Vector:
    return np.array([end.amounts[s.key] for s in species])


def balances(
    species: list[Species], feed: dict[Species, float]
) -> tuple[list[str], Vector, Vector]:
    """Elements, formula matrix (elements, species) and element amounts of the feed, mol."""
    elements = sorted({e for s in (*species, *feed) for e in s.elements})
    A = np.array([[s.elements.get(e, 0.0) for s in species] for e in elements])
    b = np.array([sum(n * s.elements.get(e, 0.0) for s, n in feed.items()) for e in elements])
    return elements, A, b


def potentials_of(end: solver.EndState, species: list[Species]) -> Vector:
    """mu/RT of each species from the amounts; inf for a gas whose amount is zero."""
    n = amounts(end, species)
    gas = np.array([s.phase == "gas" for s in species])
    g = pure_potentials(species, end.T, end.p)
    with np.errstate(divide="ignore"):
        mixing = np.log(n / n[gas].sum()) if gas.any() and n[gas].sum() > 0 else np.zeros(len(n))
    mixing = np.where(n > 0, mixing, np.inf)
    return np.where(gas, g + mixing, g)


def check_balance(end: solver.EndState, species: list[Species], feed: dict[Species, float]) -> None:
    """Every element closes to rounding, and a trace element to its own amount."""
    _, A, b = balances(species, feed)
    n = amounts(end, species)
    assert (n >= 0).all()
    off = np.abs(A @ n - b)
    assert off.max() <= 1e-12 * b.max()
    assert (off <= 1e-9 * b).all()
    assert end.proof.element_residual == pytest.approx(off.max() / b.max(), abs=1e-13)


def check_optimality(end: solver.EndState, species: list[Species]) -> None:
    """One set of element potentials explains every species present and forbids every absent one."""
    _, A, _ = balances(species, {})
    n = amounts(end, species)
    mu = potentials_of(end, species)
    gas = np.array([s.phase == "gas" for s in species])
    total = n.sum()
    sure = n > 1e-13 * total
    # The potentials from the species present; each row weighs as much as its amount is certain.
    weight = np.sqrt(n[sure] / total)
    potentials = np.linalg.lstsq(A[:, sure].T * weight[:, None], mu[sure] * weight, rcond=None)[0]
    off = mu - A.T @ potentials
    assert np.abs(off[sure] * weight).max() < 1e-8
    if np.linalg.matrix_rank(A[:, sure]) < np.linalg.matrix_rank(A):
        return  # an element present in traces only: its potential is not in what is present
    rest = gas & (n > 1e-290) & (n[gas].sum() > 0)
    assert np.abs(off[rest]).max(initial=0.0) < 1e-4
    for s, driving in zip(species, off, strict=True):
        if s.key in end.proof.absent and np.isfinite(driving):
            assert end.proof.absent[s.key] == pytest.approx(np.exp(-driving), rel=1e-4, abs=1e-12)


@every_mixture
def test_elements_close(mixture: Mixture):
    check_balance(settled(mixture), mixture.species, mixture.feed_amounts)


@every_mixture
def test_state_is_optimal(mixture: Mixture):
    check_optimality(settled(mixture), mixture.species)


@every_mixture
def test_proof_is_within_tolerance(mixture: Mixture):
    end = settled(mixture)
    assert end.proof.element_residual <= 1e-12
    assert end.proof.energy_residual == 0
    assert -1e-12 <= end.proof.gap <= 1e-9
    condensed = {s.key for s in mixture.species if s.phase != "gas"}
    fed = {e for s, n in mixture.feed_amounts.items() if n > 0 for e in s.elements}
    missing = {
        s.key
        for s in mixture.species
        if s.key in condensed and set(s.elements) <= fed and end.amounts[s.key] == 0
    }
    assert missing <= set(end.proof.absent) <= condensed
    assert all(activity <= 1 + 1e-9 for activity in end.proof.absent.values())


@random_seeds
def test_random_mixture_obeys_the_laws(seed: int):
    problem = random_problem(seed)
    species = list(problem.species)
    end = settle_Tp(species, problem.feed, problem.T, problem.p)
    check_balance(end, species, problem.feed)
    check_optimality(end, species)
    assert end.proof.gap <= 1e-9


@random_seeds
@pytest.mark.parametrize("pair", sorted(set(solver.PAIRS) - {"T,p"}))
def test_random_state_comes_back_from_any_pair(seed: int, pair: str):
    """Whichever two variables of an end state are held, its T and p come back."""
    problem = random_problem(seed)
    species = list(problem.species)
    end = settle_Tp(species, problem.feed, problem.T, problem.p)
    n_gas = end.phase_amounts.get("gas", 0.0)
    if pair.endswith("V") and n_gas < 1e-9 * sum(end.amounts.values()):
        pytest.skip("without gas no volume")
    held = {name: getattr(end, name) for name in pair.split(",")}
    back = solver.settle(species, problem.feed, solver.Fixed(pair, **held))
    check_balance(back, species, problem.feed)
    assert back.proof.energy_residual <= 1e-10
    assert pytest.approx(end.T, rel=1e-8) == back.T
    assert pytest.approx(end.p, rel=1e-6) == back.p


@every_mixture
def test_no_reaction_lowers_the_Gibbs_energy(mixture: Mixture):
    """Small steps along what the balances leave free never go down."""
    species = mixture.species
    end = settled(mixture)
    _, A, _ = balances(species, {})
    n = amounts(end, species)
    present = np.flatnonzero(n > 1e-9 * n.sum())
    if len(present) < 2:
        return
    _, sizes, free = np.linalg.svd(A[:, present])
    free = free[int((sizes > 1e-10 * sizes[0]).sum()) :]
    rng = np.random.default_rng(7)
    gas = np.array([s.phase == "gas" for s in species])
    g = pure_potentials(species, end.T, end.p)

    def gibbs(n: Vector) -> float:
        some = gas & (n > 0)
        return float(g @ n + (n[some] @ np.log(n[some] / n[some].sum()) if some.any() else 0.0))

    lowest = gibbs(n)
    for _ in range(20 if len(free) else 0):
        direction = rng.standard_normal(len(free)) @ free
        step = 0.3 * np.min(n[present] / np.maximum(np.abs(direction), 1e-30))
        for way in (step, -step):
            moved = n.copy()
            moved[present] += way * direction
            assert gibbs(moved) >= lowest - 1e-12 * abs(lowest)


@every_mixture
def test_order_of_species_does_not_matter(mixture: Mixture):
    species = mixture.species
    end = settled(mixture)
    shuffled = [species[i] for i in np.random.default_rng(3).permutation(len(species))]
    other = settle_Tp(shuffled, mixture.feed_amounts, mixture.T, mixture.p)
    assert set(other.amounts) == set(end.amounts)
    n, m = amounts(end, species), amounts(other, species)
    assert np.abs(n - m).max() <= 1e-10 * n.sum()
    seen = n > 1e-12 * n.sum()
    np.testing.assert_allclose(m[seen], n[seen], rtol=1e-6)
    assert end.G == pytest.approx(other.G, rel=1e-12)


@every_mixture
@pytest.mark.parametrize("size", [1e-6, 1e-3, 1e3, 1e6])
def test_size_of_the_feed_does_not_matter(mixture: Mixture, size: float):
    end = settled(mixture)
    feed = {s: size * n for s, n in mixture.feed_amounts.items()}
    scaled = settle_Tp(mixture.species, feed, mixture.T, mixture.p)
    n = amounts(end, mixture.species)
    m = amounts(scaled, mixture.species) / size
    assert np.abs(n - m).max() <= 1e-10 * n.sum()
    for name in ("V", "H", "U", "S", "G"):
        assert getattr(scaled, name) / size == pytest.approx(getattr(end, name), rel=1e-9)


@every_mixture
def test_condensed_candidate_with_room_to_spare_changes_nothing(mixture: Mixture):
    """A candidate of activity below one may as well not be asked about."""
    end = settled(mixture)
    species = mixture.species
    spare = {key for key, activity in end.proof.absent.items() if activity < 0.999}
    left = [s for s in species if s.key not in spare]
    other = settle_Tp(left, mixture.feed_amounts, mixture.T, mixture.p)
    n, m = amounts(end, left), amounts(other, left)
    assert all(end.amounts[key] == 0 for key in spare)
    assert np.abs(n - m).max() <= 1e-10 * n.sum()


@pytest.mark.parametrize(
    "name",
    ["reformer", "soot from methane", "flame gas", "lime kiln", "iron ore in reducing gas"],
)
def test_enthalpy_and_entropy_rise_with_temperature(name: str):
    mixture = BY_NAME[name]
    T = np.linspace(350.0, 2500.0, 60)
    ends = [settle_Tp(mixture.species, mixture.feed_amounts, t, mixture.p) for t in T]
    H = np.array([end.H for end in ends])
    S = np.array([end.S for end in ends])
    assert (np.diff(H) > 0).all()
    assert (np.diff(S) > 0).all()


@every_mixture
def test_enthalpy_leads_back_to_temperature(mixture: Mixture):
    end = settled(mixture)
    back = solver.settle(
        mixture.species, mixture.feed_amounts, solver.Fixed("H,p", H=end.H, p=mixture.p)
    )
    assert pytest.approx(end.T, rel=1e-8) == back.T
    assert back.proof.energy_residual <= 1e-10
    check_balance(back, mixture.species, mixture.feed_amounts)


@pytest.mark.parametrize("mixture", [m for m in MIXTURES if m.name != "no gas at all"], ids=str)
def test_energy_and_volume_lead_back_to_temperature_and_pressure(mixture: Mixture):
    end = settled(mixture)
    back = solver.settle(
        mixture.species, mixture.feed_amounts, solver.Fixed("U,V", U=end.U, V=end.V)
    )
    assert pytest.approx(end.T, rel=1e-8) == back.T
    assert pytest.approx(end.p, rel=1e-7) == back.p
    assert back.proof.energy_residual <= 1e-10
    check_balance(back, mixture.species, mixture.feed_amounts)


@every_mixture
def test_energies_fit_together(mixture: Mixture):
    end = settled(mixture)
    assert pytest.approx(end.H - end.T * end.S, rel=1e-9) == end.G
    assert pytest.approx(end.H - end.p * end.V, rel=1e-12) == end.U


@every_mixture
def test_gibbs_energy_falls_with_S_and_rises_with_V(mixture: Mixture):
    """dG = -S dT + V dp at the minimum, where amounts may be held (envelope theorem)."""
    end = settled(mixture)
    feed, species, T, p = mixture.feed_amounts, mixture.species, mixture.T, mixture.p
    step = 1e-4

    def G(T: float, p: float) -> float:
        return settle_Tp(species, feed, T, p).G

    by_T = (G(T * (1 + step), p) - G(T * (1 - step), p)) / (2 * step * T)
    assert -by_T == pytest.approx(end.S, rel=1e-6)
    by_p = (G(T, p * (1 + step)) - G(T, p * (1 - step))) / (2 * step * p)
    assert by_p == pytest.approx(end.V, rel=1e-5, abs=1e-9 * abs(end.G) / p)


@pytest.mark.parametrize("amount", [1e-100, 1e-200, 1e-240, 1e-260, 1e-300, 5e-324])
@pytest.mark.parametrize("T", [300.0, 1500.0])
@pytest.mark.parametrize(
    ("keys", "feed"),
    [
        ("N2 O2 NO Ar", {"N2": 0.8, "O2": 0.2, "Ar": None}),
        ("N2 O2 NO H2 H2O H OH", {"N2": 0.8, "O2": 0.2, "H2": None}),
        ("N2 O2 Fe Fe(s) Fe2O3(s)", {"N2": 0.8, "O2": 0.2, "Fe(s)": None}),
        ("Fe Fe(s) Fe(l) Ar", {"Fe(s)": 1.0, "Ar": None}),
    ],
)
def test_amounts_below_all_measure_are_kept_or_count_as_nothing(keys, feed, T, amount):
    """Amounts that one end state leaves and another is fed may be 1e-300 mol, and do no harm."""
    species = [LIB[key] for key in keys.split()]
    given = {LIB[key]: amount if x is None else x for key, x in feed.items()}
    counted = {sp: x for sp, x in given.items() if x > 1e-250}
    for fixed in (solver.Fixed("T,p", T=T, p=1e5), solver.Fixed("T,V", T=T, V=1e-3)):
        end = solver.settle(species, given, fixed)
        check_balance(end, species, counted)
        ends = solver.settle_many(species, given, fixed.pair, *([x] for x in fixed.values))
        assert ends.settled.all()
        np.testing.assert_allclose(ends.amounts[0], list(end.amounts.values()), atol=1e-12)
