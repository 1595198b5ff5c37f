"""The minimiser beside a general conic solver on random problems with real species."""

from __future__ import annotations

import contextlib
import warnings

import numpy as np
import pytest

import solver
from species_db import R
from tests.solver.peers.conic import Answer, NoAnswerError, minimise
from tests.solver.peers.problems import FUZZ, Arrays, arrays, gibbs, random_problem

CASES = range(60 * FUZZ)


def conic(problem: Arrays) -> Answer:
    """The peer warns when it stops short of 1e-10; its own gap then widens the comparison."""
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Solution may be inaccurate")
        try:
            return minimise(problem)
        except NoAnswerError as error:
            pytest.skip(f"the conic solver gave up: {error}")


@pytest.mark.parametrize("seed", CASES)
def test_same_minimum_as_a_conic_solver(seed: int):
    problem = random_problem(seed)
    data = arrays(problem)
    peer = conic(data)
    end = solver.settle(
        list(problem.species), problem.feed, solver.Fixed("T,p", T=problem.T, p=problem.p)
    )
    n = np.array([end.amounts[s.key] for s in problem.species])
    total = n.sum()
    own = gibbs(data, n)
    # how far the peer is from its own bound, and its balance from the feed
    accuracy = abs(peer.gibbs - peer.bound) / total + peer.residual
    if accuracy > 1e-5:
        pytest.skip(f"the conic solver's own answer is good to {accuracy:.0e} only")

    # never below the bound of the peer's dual, never above its minimum
    assert own >= peer.bound - 1e-9 * total, str(problem)
    assert abs(own - peer.gibbs) <= (1e-8 + accuracy) * total, str(problem)
    assert own == pytest.approx(end.G / (R * problem.T), rel=1e-10, abs=1e-10 * total)
    # A gap d allows fractions to differ by sqrt(2 d): Pinsker's inequality on the mixing entropy.
    assert np.abs(n - peer.n).max() <= (1e-6 + np.sqrt(2 * accuracy)) * total, str(problem)


def test_most_problems_are_compared():
    """The peer answers at least 55 of the first 60, to 1e-6 or better."""
    found = 0
    for seed in range(60):
        data = arrays(random_problem(seed))
        with warnings.catch_warnings(), contextlib.suppress(NoAnswerError):
            warnings.filterwarnings("ignore", message="Solution may be inaccurate")
            peer = minimise(data)
            found += abs(peer.gibbs - peer.bound) / peer.n.sum() + peer.residual < 1e-6
    assert found >= 55


def test_problems_are_varied():
    """The random problems cover what the comparison is for."""
    problems = [random_problem(seed) for seed in CASES]
    elements = {len({e for s in p.species for e in s.elements}) for p in problems}
    assert {1, 2, 3, 4, 5, 6} <= elements
    assert sum(any(s.phase != "gas" for s in p.species) for p in problems) >= 40
    assert min(p.T for p in problems) < 500
    assert max(p.T for p in problems) > 3500
    assert min(p.p for p in problems) < 5e3
    assert max(p.p for p in problems) > 1e7
