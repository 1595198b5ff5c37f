"""Time to settle one mixture, beside general-purpose solvers in the same run.

`make bench` runs this and writes `notes.md`; in the tests each runs once and is compared.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache

import numpy as np
import numpy.typing as npt
import pytest

import solver
from tests.bench import peers
from tests.solver.peers.problems import Arrays, Problem, arrays, gibbs, library

SPECIES = 68

Solve = Callable[[], npt.NDArray[np.float64]]


@cache
def mixture(with_graphite: bool) -> Problem:
    """Reforming gas of 68 species of C, H, O and N (the smallest of the library)."""
    lib = library()
    small = [s for s in lib.made_of({"C", "H", "O", "N"}, phases=("gas",)) if s.T_max >= 3000]
    species = [*small[:SPECIES], *([lib["C(gr)"]] if with_graphite else [])]
    feed = {lib["CH4"]: 1.0, lib["O2"]: 0.3, lib["N2"]: 1.2}
    return Problem(0, tuple(species), feed, 1150.0, 2.0e5)


def thalweg(problem: Problem) -> Solve:
    species = list(problem.species)
    fixed = solver.Fixed("T,p", T=problem.T, p=problem.p)

    def solve() -> npt.NDArray[np.float64]:
        end = solver.settle(species, problem.feed, fixed)
        return np.array([end.amounts[s.key] for s in species])

    return solve


def peer(make: Callable[[Arrays], Solve]) -> Callable[[Problem], Solve]:
    return lambda problem: make(arrays(problem))


SOLVERS: dict[str, tuple[Callable[[Problem], Solve], float]] = {
    # with what each reaches in G/nRT, as an upper limit of what it may miss
    "Thalweg": (thalweg, 1e-9),
    "Clarabel": (peer(peers.conic), 1e-6),
    "IPOPT": (peer(peers.ipopt), 1e-6),
    "SLSQP": (peer(peers.slsqp), 1e-2),
}


@pytest.mark.parametrize("with_graphite", [False, True], ids=["gas", "gas and graphite"])
@pytest.mark.parametrize("name", SOLVERS)
@pytest.mark.benchmark(warmup=True, warmup_iterations=2, min_rounds=5, max_time=3.0)
def test_settle_one(benchmark, name: str, with_graphite: bool):
    problem = mixture(with_graphite)
    make, may_miss = SOLVERS[name]
    solve = make(problem)
    n = benchmark(solve)
    data = arrays(problem)
    best = gibbs(data, thalweg(problem)())
    missed = (gibbs(data, n) - best) / n.sum()
    off = np.abs(data.A @ n - data.b).max() / data.b.max()
    benchmark.extra_info |= {"missed": missed, "balance": off}
    assert abs(missed) < may_miss
    assert off < max(may_miss, 1e-6)


@pytest.mark.parametrize(
    ("pair", "values"), [("H,p", ("H", "p")), ("U,V", ("U", "V"))], ids=["H,p", "U,V"]
)
@pytest.mark.benchmark(warmup=True, warmup_iterations=2, min_rounds=5, max_time=3.0)
def test_settle_energy(benchmark, pair: str, values: tuple[str, str]):
    """The adiabatic kinds on the same gas with graphite, fed at 700 K."""
    problem = mixture(True)
    fed = solver.as_fed(problem.feed, T=700.0, p=problem.p)
    fixed = solver.Fixed(pair, **{name: getattr(fed, name) for name in values})
    end = benchmark(lambda: solver.settle(list(problem.species), problem.feed, fixed))
    assert end.proof.energy_residual <= 1e-10


BATCHES = {"gas": False, "gas and graphite": True}


@pytest.mark.parametrize("name", BATCHES)
@pytest.mark.benchmark(warmup=True, warmup_iterations=1, min_rounds=3, max_time=3.0)
def test_settle_many(benchmark, name: str):
    """A thousand unordered cases in one call: random temperature and feed."""
    problem = mixture(BATCHES[name])
    species, cases = list(problem.species), 1000
    rng = np.random.default_rng(11)
    T = rng.uniform(700.0, 2500.0, cases)
    p = np.full(cases, problem.p)
    feeds = {s: n * rng.uniform(0.3, 1.0, cases) for s, n in problem.feed.items()}
    ends = benchmark(lambda: solver.settle_many(species, feeds, "T,p", T, p))
    assert ends.settled.all()
    for i in range(0, cases, 97):
        one = solver.settle(
            species, {s: n[i] for s, n in feeds.items()}, solver.Fixed("T,p", T=T[i], p=p[i])
        )
        assert ends.G[i] == pytest.approx(one.G, rel=1e-9)
