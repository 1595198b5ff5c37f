"""A seeded part of the random real mixtures, and what they ever brought up."""

from __future__ import annotations

import pytest

from tests.fuzz.real import NAMED, judge_real, named_problem, real_problem

BLOCKS, SIZE = 6, 20


@pytest.mark.parametrize("block", range(BLOCKS))
def test_random_real_mixtures_settle_and_are_found_again(block: int):
    seeds = range(block * SIZE, (block + 1) * SIZE)
    verdicts = {seed: judge_real(real_problem(seed)) for seed in seeds}
    assert not {seed: text for seed, text in verdicts.items() if text.startswith("failed")}


@pytest.mark.parametrize("data", NAMED, ids=[data["why"] for data in NAMED])
def test_named_real_mixture(data: dict):
    verdict = judge_real(named_problem(data))
    assert not verdict.startswith(("failed", "refused")), verdict
