"""A seeded part of the random problems; `make fuzz` runs many more."""

from __future__ import annotations

import pytest

from tests.fuzz.judge import judge
from tests.fuzz.problems import random_problem

BLOCKS, SIZE = 10, 30


@pytest.mark.parametrize("block", range(BLOCKS))
def test_random_problems_settle_or_are_refused_for_cause(block):
    failed = {}
    for seed in range(101_000 + block * SIZE, 101_000 + (block + 1) * SIZE):
        verdict = judge(random_problem(seed), lower_bound=seed % 4 == 0)
        if verdict.failed:
            failed[seed] = verdict.text
    assert not failed


def test_a_problem_survives_its_text():
    import json

    from tests.fuzz.problems import Problem

    problem = random_problem(11)
    assert Problem.of(json.loads(problem.to_json())) == problem
