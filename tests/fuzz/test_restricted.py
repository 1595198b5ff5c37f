"""Random restrictions: what is restricted holds, the proof too, and nothing is gained by it."""

from __future__ import annotations

import pytest

from tests.fuzz.restricted import judge_restricted, random_restricted


@pytest.mark.parametrize("block", range(2))
def test_restrictions_hold(block):
    failed, kinds = {}, set()
    for seed in range(210_000 + block * 40, 210_000 + (block + 1) * 40):
        case = random_restricted(seed)
        if case is None:
            continue
        verdict = judge_restricted(case)
        kinds |= {type(r).__name__ for r in case.restrictions if verdict.kind == "settled"}
        if verdict.failed:
            failed[seed] = verdict.text
    assert not failed
    assert kinds == {"Inert", "FixedConversion", "HeldApproach", "NoExchange"}
