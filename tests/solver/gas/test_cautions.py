"""What is said of a state where a cubic equation of state is poor, and what is not said."""

from __future__ import annotations

import numpy as np
import pytest

from solver.gas.cautions import cautions
from tests.solver.gas.states import fluid_of

KEYS = ("N2", "H2", "NH3", "CH4", "H2O", "OH", "CH3OH", "Ne")
BOTH = pytest.mark.parametrize("key", ["srk", "pr"])


def said(key: str, T: float, p: float, **amounts: float) -> tuple[str, ...]:
    n = np.array([amounts.get(name, 0.0) for name in KEYS])
    return cautions(fluid_of(KEYS, key), T, p, n)


@BOTH
def test_nothing_to_say(key: str):
    assert said(key, 700.0, 2e7, N2=1.0, H2=3.0, NH3=0.5) == ()
    assert said(key, 400.0, 1e5, H2O=1.0, CH4=1.0, OH=1e-6) == ()
    assert said(key, 400.0, 1e5) == ()


@BOTH
@pytest.mark.parametrize(
    ("T", "p", "amounts", "words"),
    [
        (60.0, 1e4, {"H2": 1.0}, ("quantum", "H2")),
        (2500.0, 1e6, {"N2": 9.0, "NH3": 1.0}, ("attraction", "N2")),
        (300.0, 1e6, {"H2O": 1.0}, ("hydrogen bonds", "H2O")),
        (300.0, 1e6, {"CH3OH": 0.5, "H2O": 0.5}, ("hydrogen bonds", "CH3OH")),
        (690.0, 3.2e7, {"H2O": 1.0}, ("hydrogen bonds", "H2O")),
        (300.0, 1e6, {"H2O": 1.0}, ("critical density",)),
        (500.0, 2e8, {"N2": 1.0}, ("2000 bar",)),
        (192.0, 4.5e6, {"CH4": 1.0}, ("critical point", "190.6 K")),
        (1900.0, 1e5, {"H2O": 1.0, "OH": 0.1}, ("critical constants", "OH")),
    ],
)
def test_said_where_it_should_be(key, T, p, amounts, words):
    found = said(key, T, p, **amounts)
    assert any(all(word in sentence for word in words) for sentence in found), found
    assert all(sentence[0].isupper() and sentence.endswith(".") for sentence in found)


@BOTH
def test_a_trace_is_not_spoken_of(key: str):
    assert not any("H2O" in sentence for sentence in said(key, 200.0, 3e7, CH4=1.0, H2O=0.01))
    assert said(key, 1900.0, 1e5, H2O=1.0, OH=0.005) == ()
