"""Time to settle one mixture, beside general-purpose solvers in the same run.

`make bench` runs this and writes `notes.md`; in the tests each runs once and is compared.
"""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from functools import cache

import numpy as np
import numpy.typing as npt
import pytest

import solver
from tests.bench import peers
from tests.bench.beside import times_of
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
    if name == "Clarabel":
        benchmark.extra_info["over Thalweg"] = times_of(thalweg(problem), solve, 60)
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
    species = list(problem.species)

    def settle() -> solver.EndState:
        return solver.settle(species, problem.feed, fixed)

    end = benchmark(settle)
    assert end.proof.energy_residual <= 1e-10
    benchmark.extra_info["over T,p"] = times_of(thalweg(problem), settle, 40)


CASES = 1000


def batch(with_graphite: bool, kind: str):
    """Arguments of settle_many: a thousand unordered cases, or a line in temperature."""
    problem = mixture(with_graphite)
    species = list(problem.species)
    rng = np.random.default_rng(11)
    if kind == "T,p line":
        T = np.linspace(700.0, 2500.0, CASES)
        return species, problem.feed, "T,p", T, np.full(CASES, problem.p)
    T = rng.uniform(700.0, 2500.0, CASES)
    p = np.full(CASES, problem.p)
    feeds = {s: n * rng.uniform(0.3, 1.0, CASES) for s, n in problem.feed.items()}
    if kind == "T,p":
        return species, feeds, "T,p", T, p
    ends = solver.settle_many(species, feeds, "T,p", T, p)
    if kind == "H,p":
        return species, feeds, "H,p", ends.H, p
    return species, feeds, "U,V", ends.U, ends.V


@pytest.mark.parametrize("with_graphite", [False, True], ids=["gas", "gas and graphite"])
@pytest.mark.parametrize("kind", ["T,p", "T,p line", "H,p", "U,V"])
@pytest.mark.benchmark(warmup=True, warmup_iterations=1, min_rounds=5, max_time=3.0)
def test_settle_many(benchmark, kind: str, with_graphite: bool):
    """A thousand cases in one call."""
    species, feeds, pair, X, Y = batch(with_graphite, kind)

    def settle() -> solver.EndStates:
        return solver.settle_many(species, feeds, pair, X, Y)

    ends = benchmark(settle)
    assert ends.settled.all()
    conic = peer(peers.conic)(mixture(with_graphite))
    benchmark.extra_info["Clarabel over"] = CASES * times_of(settle, conic, 12)
    plain = batch(with_graphite, "T,p")
    benchmark.extra_info["over T,p"] = times_of(lambda: solver.settle_many(*plain), settle, 8)
    names = solver.PAIRS[pair].variables
    for i in range(0, CASES, 97):
        one = solver.settle(
            species,
            {s: float(np.broadcast_to(n, CASES)[i]) for s, n in feeds.items()},
            solver.Fixed(pair, **{names[0]: X[i], names[1]: Y[i]}),
        )
        assert ends.G[i] == pytest.approx(one.G, rel=1e-9)


@pytest.mark.parametrize("with_graphite", [False, True], ids=["gas", "gas and graphite"])
@pytest.mark.parametrize("gas", ["srk", "pr"])
@pytest.mark.benchmark(warmup=True, warmup_iterations=2, min_rounds=5, max_time=3.0)
def test_settle_real(benchmark, gas: str, with_graphite: bool):
    """One case with an equation of state, beside the ideal gas of `test_settle_one`."""
    problem = mixture(with_graphite)
    species = list(problem.species)
    fixed = solver.Fixed("T,p", T=problem.T, p=problem.p)

    def settle() -> solver.EndState:
        return solver.settle(species, problem.feed, fixed, gas=gas)

    end = benchmark(settle)
    assert end.proof.holds
    assert end.fluids
    benchmark.extra_info["over ideal"] = times_of(thalweg(problem), settle, 40)


@pytest.mark.parametrize("with_graphite", [False, True], ids=["gas", "gas and graphite"])
@pytest.mark.parametrize("gas", ["srk", "pr"])
@pytest.mark.benchmark(warmup=True, warmup_iterations=1, min_rounds=5, max_time=3.0)
def test_settle_many_real(benchmark, gas: str, with_graphite: bool):
    """A thousand unordered cases with an equation of state."""
    species, feeds, pair, X, Y = batch(with_graphite, "T,p")

    def settle(gas: str = gas) -> solver.EndStates:
        return solver.settle_many(species, feeds, pair, X, Y, gas=gas)

    ends = benchmark(settle)
    assert ends.settled.all()
    benchmark.extra_info["over ideal"] = times_of(lambda: settle("ideal"), settle, 8)
    for i in range(0, CASES, 97):
        one = solver.settle(
            species,
            {s: float(n[i]) for s, n in feeds.items()},
            solver.Fixed(pair, T=X[i], p=Y[i]),
            gas=gas,
        )
        assert ends.G[i] == pytest.approx(one.G, rel=1e-9)


GROWTH = (30, 70, 150, 300, 600, 1000)


@pytest.mark.parametrize("count", GROWTH)
@pytest.mark.benchmark(warmup=True, warmup_iterations=1, min_rounds=3, max_time=1.5)
def test_growth(benchmark, count: int):
    """One cold case with ever more candidates of C, H, O, N and S."""
    lib = library()
    known = lib.made_of({"C", "H", "O", "N", "S"}, phases=("gas",))
    fed = [lib[key] for key in ("CH4", "O2", "N2", "H2S")]
    keys = {sp.key for sp in fed}
    species = [*fed, *(sp for sp in known if sp.key not in keys)][:count]
    feed = dict(zip(fed, (1.0, 0.4, 1.5, 0.02), strict=True))
    end = benchmark(lambda: solver.settle(species, feed, solver.Fixed("T,p", T=1250.0, p=2e5)))
    assert end.proof.holds


def test_memory_of_ten_thousand_cases(record_property):
    """10,000 cases of 150 species stay under 600 MB of further memory."""
    code = (
        "import resource, numpy as np, solver, species_db;"
        "lib = species_db.load();"
        "fed = [lib[k] for k in ('CH4', 'O2', 'N2')];"
        "known = [s for s in lib.made_of({'C', 'H', 'O', 'N'}, phases=('gas',)) if s not in fed];"
        "before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss;"
        "T = np.random.default_rng(1).uniform(800.0, 2500.0, 10_000);"
        "ends = solver.settle_many(fed + known[:147], dict(zip(fed, (1.0, 0.6, 2.0))),"
        " 'T,p', T, 1e5);"
        "assert ends.settled.all();"
        "print((resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before) / 1024)"
    )
    out = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    megabytes = float(out.stdout)
    record_property("megabytes", megabytes)
    assert megabytes < 600.0
