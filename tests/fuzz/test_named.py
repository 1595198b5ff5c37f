"""What was found by fuzzing, and the phase changes, each as a named problem.

Stored by keys and numbers: a library that changes leaves them what they are.
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

import solver
from tests.fuzz.judge import check_state, judge
from tests.fuzz.problems import Problem, library

FOUND = json.loads((Path(__file__).parent / "named.json").read_text(encoding="utf-8"))


@pytest.mark.parametrize("entry", FOUND, ids=[entry["name"] for entry in FOUND])
def test_found_problem_settles(entry):
    verdict = judge(Problem.of(entry["problem"]), lower_bound=True)
    assert not verdict.failed, f"{entry['tests']}: {verdict.text}"
    assert verdict.kind == entry.get("outcome", "settled"), verdict.text


IRON = "Fe Fe(s) Fe(l)"
SULFUR = "S S2 S3 S4 S5 S6 S7 S8 S(s) S(l)"
LIME = "CaCO3(calcite) CaO(s) CO2 CO O2"
# name, candidates, feed, held beside the energy, T before and after the phase change, phases
# of the split, K between which the transition lies (only to know which one it is: the exact
# temperature is that of the records).
PLATEAUS = [
    ("water boils at 1 bar", "H2O H2O(l)", "H2O(l)", {"p": 1e5}, (365, 380), {"gas", "H2O(l)"}),
    ("water boils at 10 bar", "H2O H2O(l)", "H2O(l)", {"p": 1e6}, (440, 465), {"gas", "H2O(l)"}),
    ("ice melts", "H2O H2O(l) H2O(s)", "H2O(s)", {"p": 1e5}, (270, 276), {"H2O(s)", "H2O(l)"}),
    ("ferrite to austenite", IRON, "Fe(s)", {"p": 1e5}, (1180, 1190), {"Fe(s)"}),
    ("austenite to delta iron", IRON, "Fe(s)", {"p": 1e5}, (1660, 1670), {"Fe(s)"}),
    ("iron melts", IRON, "Fe(s)", {"p": 1e5}, (1800, 1820), {"Fe(s)", "Fe(l)"}),
    ("iron melts, no gas", "Fe(s) Fe(l)", "Fe(s)", {"p": 1e5}, (1800, 1820), {"Fe(s)", "Fe(l)"}),
    ("iron melts in a vessel, no gas", "Fe(s) Fe(l)", "Fe(s)", {"V": 1e-3}, (1800, 1820),
     {"Fe(s)", "Fe(l)"}),
    ("sulfur melts", SULFUR, "S(s)", {"p": 1e5}, (380, 396), {"S(s)", "S(l)"}),
    ("sulfur melts in a vessel", SULFUR, "S(s)", {"V": 1e-3}, (380, 396), {"gas", "S(s)", "S(l)"}),
    ("lime burns at 1 bar", LIME, "CaCO3(calcite)", {"p": 1e5}, (1130, 1210),
     {"gas", "CaCO3(calcite)", "CaO(s)"}),
]  # fmt: skip


@pytest.mark.parametrize("share", [0.02, 0.5, 0.98])
@pytest.mark.parametrize("variable", ["energy", "S"])
@pytest.mark.parametrize("case", PLATEAUS, ids=[case[0] for case in PLATEAUS])
def test_plateau_is_a_split_on_the_transition(case, variable, share):
    _, candidates, fed, held, (low, high), phases = case
    lib = library()
    species, feed = [lib[key] for key in candidates.split()], {lib[fed]: 2.0}
    second = "V" if "V" in held else "p"
    name = variable if variable == "S" else ("U" if second == "V" else "H")
    ends = [solver.settle(species, feed, solver.Fixed(f"T,{second}", T=T, **held))
            for T in (low, high)]  # fmt: skip
    T = transition(species, feed, second, held, low, high, name)
    before, after = (
        solver.settle(species, feed, solver.Fixed(f"T,{second}", T=T + d, **held))
        for d in (-1e-6, 1e-6)
    )
    bottom, top = getattr(before, name), getattr(after, name)
    # nearly all of the change lies on the transition itself
    assert top - bottom > 0.3 * (getattr(ends[1], name) - getattr(ends[0], name))
    value = bottom + share * (top - bottom)
    end = solver.settle(species, feed, solver.Fixed(f"{name},{second}", **{name: value}, **held))
    check_state(end, species, feed)
    assert abs(end.T - T) < 2e-6
    assert set(end.phase_amounts) == phases
    assert getattr(end, name) == pytest.approx(value, abs=1e-9 * abs(top - bottom))


def transition(species, feed, second, held, low, high, name):
    """Where the energy or entropy jumps, by halving on its larger rise."""

    def value(T):
        end = solver.settle(species, feed, solver.Fixed(f"T,{second}", T=T, **held))
        return getattr(end, name)

    bottom, top = value(low), value(high)
    for _ in range(60):
        middle = 0.5 * (low + high)
        if high - low < 1e-7:
            break
        at = value(middle)
        if at - bottom > top - at:
            high, top = middle, at
        else:
            low, bottom = middle, at
    return 0.5 * (low + high)


@pytest.mark.parametrize("pair", ["U,V", "S,V"])
def test_lime_decomposes_in_a_vessel_under_its_own_gas(pair):
    # No plateau: as the gas fills the vessel its pressure and the temperature rise together.
    lib = library()
    species, feed = [lib[key] for key in LIME.split()], {lib["CaCO3(calcite)"]: 1.0}
    last = None
    for T in (1000.0, 1100.0, 1200.0):
        held = solver.settle(species, feed, solver.Fixed("T,V", T=T, V=0.01))
        values = {name: getattr(held, name) for name in pair.split(",")}
        end = solver.settle(species, feed, solver.Fixed(pair, **values))
        check_state(end, species, feed)
        assert {"gas", "CaCO3(calcite)", "CaO(s)"} == set(end.phase_amounts)
        assert end.T == pytest.approx(T, rel=1e-8)
        assert last is None or end.p > 1.5 * last
        last = end.p


@pytest.mark.parametrize("pair", ["U,V", "S,V", "T,V"])
@pytest.mark.parametrize("fill", [0.01, 0.5, 0.95])
def test_liquid_in_a_sealed_vessel(pair, fill):
    lib = library()
    species, feed = [lib["H2O"], lib["H2O(l)"]], {lib["H2O"]: 1.0}
    V = lib["H2O(l)"].molar_volume / fill
    held = solver.settle(species, feed, solver.Fixed("T,V", T=400.0, V=V))
    values = {name: getattr(held, name) for name in pair.split(",")}
    end = solver.settle(species, feed, solver.Fixed(pair, **values))
    check_state(end, species, feed)
    assert set(end.phase_amounts) == {"gas", "H2O(l)"}
    assert end.T == pytest.approx(400.0, rel=1e-8)
    open_end = solver.settle(species, feed, solver.Fixed("T,p", T=400.0, p=end.p * 1.0001))
    assert set(open_end.phase_amounts) == {"H2O(l)"}  # p is the vapour pressure


TWO_AT_ONCE = [
    ("one temperature", "FeBr2(s)", "FeI2(s)", 650.0, 650.0),
    ("0.7 K apart", "NaOH(s)", "KClO4(s)", 572.0, 572.7),
]


@pytest.mark.parametrize("pair", ["H,p", "S,p", "U,V", "S,V"])
@pytest.mark.parametrize("case", TWO_AT_ONCE, ids=[case[0] for case in TWO_AT_ONCE])
def test_two_transitions_at_once(case, pair):
    _, one, other, first, second = case
    lib = library()
    species = [lib[one], lib[other]]
    feed = dict.fromkeys(species, 1.0)
    name = pair[0]
    held = {"p": 1e5} if pair[2] == "p" else {"V": 1e-3}
    kind = f"T,{pair[2]}"
    low, middle, high = (
        getattr(solver.settle(species, feed, solver.Fixed(kind, T=T, **held)), name)
        for T in (first - 1e-6, 0.5 * (first + second), second + 1e-6)
    )
    for share in (0.01, 0.3, 0.7, 0.99):
        value = low + share * (high - low)
        end = solver.settle(species, feed, solver.Fixed(pair, **{name: value}, **held))
        check_state(end, species, feed)
        assert first - 2e-6 <= end.T <= second + 2e-6
        if first < second and abs(share - 0.5) > 0.4:
            at = first if value < middle else second
            assert abs(end.T - at) < 2e-6


def test_a_line_across_boiling_and_melting():
    lib = library()
    species = [lib[key] for key in ("H2O", "H2O(l)", "H2O(s)")]
    feed = {lib["H2O"]: 1.0}
    low, high = (
        solver.settle(species, feed, solver.Fixed("T,p", T=T, p=1e5)).H for T in (200.0, 500.0)
    )
    H = np.linspace(low, high, 61)
    ends = solver.settle_many(species, feed, "H,p", H, 1e5)
    assert ends.settled.all()
    assert (np.diff(ends.T) >= -1e-9).all()
    assert np.abs(ends.H - H).max() < 1e-9 * abs(high - low)
    boiling = (ends.amounts[:, 0] > 0.0) & (ends.amounts[:, 1] > 0.0)
    melting = (ends.amounts[:, 2] > 0.0) & (ends.amounts[:, 1] > 0.0)
    for on in (boiling, melting):
        assert on.sum() > 3
        assert np.ptp(ends.T[on]) < 1e-6
