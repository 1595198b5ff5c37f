"""Settles a problem and judges the outcome by figures computed here, not by the solver's own."""

from __future__ import annotations

import time
import warnings
from dataclasses import dataclass, replace

import numpy as np
from scipy.optimize import linprog

import solver
from solver.fixed import PAIRS as KNOWN
from solver.fixed import T_HIGHEST, T_LOWEST
from species_db import Species
from tests.fuzz.problems import Problem, R

P0 = 1e5
P_CRUSH = 1e9  # Pa; beyond, a vessel may be refused as too small for what is in it
ELEMENTS, TRACES, ENERGY, GAP = 1e-12, 1e-9, 1e-10, 1e-9


@dataclass(frozen=True)
class Verdict:
    """What became of a problem: "settled", "no end state", "refused" or "failed"."""

    kind: str
    text: str = ""
    elements: float = 0.0
    traces: float = 0.0
    energy: float = 0.0
    gap: float = 0.0
    seconds: float = 0.0

    @property
    def failed(self) -> bool:
        return self.kind == "failed"


class Fault(Exception):
    """The solver is wrong, and how."""


def judge(problem: Problem, *, lower_bound: bool = False) -> Verdict:
    """Settle a problem; `lower_bound` adds the linear program that bounds its free energy."""
    begin = time.perf_counter()
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            verdict = _judged(problem, lower_bound)
    except Fault as fault:
        verdict = Verdict("failed", str(fault))
    except Exception as error:  # whatever it is, an engineer must not see it
        verdict = Verdict("failed", f"{type(error).__name__}: {error}")
    return replace(verdict, seconds=time.perf_counter() - begin)


def _judged(problem: Problem, lower_bound: bool) -> Verdict:
    species, feed = problem.species, problem.fed
    pair = KNOWN[problem.pair]
    start = fixed = None
    try:
        if problem.values:
            fixed = solver.Fixed(problem.pair, **problem.values)
        else:
            if pair.holds_volume:
                at = solver.Fixed("T,V", T=problem.T, V=problem.volume)
            else:
                at = solver.Fixed("T,p", T=problem.T, p=problem.p)
            if pair.searched is None:
                fixed = at
            else:
                start = solver.settle(species, feed, at)
                check_state(start, species, feed)
                value = getattr(start, pair.searched) + problem.offset
                second = pair.variables[1]
                fixed = solver.Fixed(
                    problem.pair, **{pair.searched: value, second: getattr(at, second)}
                )
        end = solver.settle(species, feed, fixed)
    except solver.NoEndState as error:
        check_out_of_range(problem, species, feed, fixed, start)
        return Verdict("no end state", str(error))
    except solver.InputError as error:
        check_refusal(problem, species, feed, fixed, error)
        return Verdict("refused", str(error))
    verdict = check_state(end, species, feed)
    if start is not None and not problem.offset and abs(end.T / start.T - 1.0) > 1e-8:
        raise Fault(f"{problem.pair} ends at {end.T!r} K, not at {start.T!r} K where it began")
    if lower_bound:
        check_lower_bound(end, species, feed)
    return verdict


def check_state(
    end: solver.EndState, species: list[Species], feed: dict[Species, float]
) -> Verdict:
    """Amounts, balances, state functions and the solver's own proof; raises Fault."""
    n = np.array([end.amounts[sp.key] for sp in species])
    if not np.isfinite(n).all() or (n < 0.0).any():
        raise Fault(f"an amount is {n.min()}")
    elements, traces = closure(n, species, feed)
    if elements > ELEMENTS or traces > TRACES:
        raise Fault(f"element residual {elements:.1e}, of traces {traces:.1e}")
    proof = end.proof
    if not (abs(proof.gap) <= GAP and proof.energy_residual <= ENERGY):
        raise Fault(f"gap {proof.gap:.1e}, energy {proof.energy_residual:.1e}")
    for key, activity in proof.absent.items():
        if not 0.0 <= activity <= 1.0:
            raise Fault(f"absent {key} has the activity {activity}")
    energy = check_functions(end, species, n)
    return Verdict("settled", "", elements, traces, max(energy, proof.energy_residual), proof.gap)


def closure(
    n: np.ndarray, species: list[Species], feed: dict[Species, float]
) -> tuple[float, float]:
    """Worst element residual over the largest total, and over each element's own total."""
    rows = sorted({e for sp in (*species, *feed) for e in sp.elements})
    A, b = balances(species, feed, rows)
    off = np.abs(n @ A - b)
    some = b > 0.0
    if off[~some].any():
        raise Fault("an element that is not fed is there")
    charge = np.array([sp.charge for sp in species])
    unbalanced = abs(n @ charge - sum(x * sp.charge for sp, x in feed.items()))
    return max(off.max(), unbalanced) / b.max(), float((off[some] / b[some]).max())


def balances(
    species: list[Species], feed: dict[Species, float], rows: list[str]
) -> tuple[np.ndarray, np.ndarray]:
    A = np.array([[float(sp.elements.get(e, 0.0)) for e in rows] for sp in species])
    b = np.array([sum(x * sp.elements.get(e, 0.0) for sp, x in feed.items()) for e in rows])
    return A, b


def check_functions(end: solver.EndState, species: list[Species], n: np.ndarray) -> float:
    """State functions from the species' own; on a phase change, between those of its two sides.

    Returns how far the energy or entropy held is from that of the amounts, over n R T or n R.
    """
    T, total = end.T, n.sum()
    gas = np.array([sp.phase == "gas" for sp in species])
    v = np.array([sp.molar_volume or 0.0 if sp.phase != "gas" else 0.0 for sp in species])
    N = n[gas].sum()
    V = n @ v + (N * R * T / end.p if N else 0.0)
    if KNOWN[end.fixed.pair].holds_volume and not N and not end.p:
        # nothing evaporates: the rest of the vessel is empty
        if V > end.V * (1.0 + 1e-10):
            raise Fault(f"{V} m3 of condensed phases are in a vessel of {end.V} m3")
        V = end.V
    y = n[gas][n[gas] > 0.0] / N if N else np.zeros(0)
    mixing = N * R * (np.log(end.p / P0) + y @ np.log(y)) if N else 0.0
    bounds = []
    # a chained record jumps at its transition, on which T lies but for rounding
    for at in (T - 8.0 * np.spacing(T), T, T + 8.0 * np.spacing(T)):
        h = np.array([float(sp.h(at)) for sp in species])
        s = np.array([float(sp.s(at)) for sp in species])
        H = n @ h + (n @ v) * (end.p - P0)
        bounds.append({"H": H, "U": H - end.p * V, "S": n @ s - mixing})
    if abs(V - end.V) > 1e-10 * end.V:
        raise Fault(f"V is {end.V}, of the amounts it is {V}")
    worst = 0.0
    for name in ("H", "U", "S"):
        unit = R * total * (1.0 if name == "S" else T)
        value = getattr(end, name)
        low, high = min(side[name] for side in bounds), max(side[name] for side in bounds)
        # rounding of sums of large terms, in units of n R T
        room = 1e-10 + 1e-14 * max(abs(low), abs(high), end.p * V * (name != "S")) / unit
        off = max(low - value, value - high) / unit
        if off > room:
            raise Fault(f"{name} is {value}, of the amounts it is {high}: {off:.1e} n R T")
        if name == KNOWN[end.fixed.pair].searched:
            held = getattr(end.fixed, name)
            worst = max(off, abs(value - held) / unit)
    if worst > 2.0 * ENERGY:
        raise Fault(f"energy residual {worst:.1e}")
    return max(worst, 0.0)


def check_out_of_range(
    problem: Problem,
    species: list[Species],
    feed: dict[Species, float],
    fixed: solver.Fixed,
    start: solver.EndState | None,
) -> None:
    """That the value held lies beyond those at the ends of the temperature range."""
    pair = KNOWN[problem.pair]
    if start is not None and not problem.offset:
        raise Fault(f"no end state, yet {start.T} K has this {pair.searched}")
    assert pair.searched is not None
    second = pair.variables[1]
    ends = []
    for T in (T_LOWEST, T_HIGHEST):
        kind = "T,V" if pair.holds_volume else "T,p"
        held = solver.Fixed(kind, **{"T": T, second: getattr(fixed, second)})
        ends.append(getattr(solver.settle(species, feed, held), pair.searched))
    if ends[0] <= getattr(fixed, pair.searched) <= ends[1]:
        raise Fault(f"no end state, yet {pair.searched} is within {ends[0]} to {ends[1]}")


def check_refusal(
    problem: Problem,
    species: list[Species],
    feed: dict[Species, float],
    fixed: solver.Fixed | None,
    error: solver.InputError,
) -> None:
    """That the feed cannot be held, or that the vessel is too small; raises Fault."""
    if error.field == "fixed.V":
        if fixed is None:  # refused at the temperature from which its energy was to come
            fixed = solver.Fixed("T,V", T=problem.T, V=problem.volume)
        if fixed.V > 1.001 * least_volume(species, feed, fixed):
            raise Fault(f"the vessel is refused, yet its contents fit: {error}")
        return
    if error.field == "species":
        if {sp.key for sp in feed} <= {sp.key for sp in species}:
            raise Fault(f"the feed may stay as it is, yet it is refused: {error}")
        if can_hold(species, feed):
            raise Fault(f"the candidates can hold the feed, yet it is refused: {error}")
        return
    raise Fault(f"a valid problem is refused: {error}")


def can_hold(species: list[Species], feed: dict[Species, float]) -> bool:
    """Whether any amounts of the candidates have the elements of the feed."""
    rows = sorted({e for sp in (*species, *feed) for e in sp.elements})
    A, b = balances(species, feed, rows)
    found = linprog(np.zeros(len(species)), A_eq=A.T, b_eq=b / b.max(), bounds=(0, None))
    return bool(found.status == 0)


def least_volume(species: list[Species], feed: dict[Species, float], fixed: solver.Fixed) -> float:
    """Volume, m3, to which the contents swell or shrink under the most a vessel must bear.

    With the energy or entropy held the contents do so without heat, against that pressure: if
    they press harder, they end up larger than the vessel.
    """
    held = {"p": P_CRUSH}
    if fixed.pair == "U,V":
        at = solver.Fixed("H,p", H=fixed.U + P_CRUSH * fixed.V, **held)
    elif fixed.pair == "S,V":
        at = solver.Fixed("S,p", S=fixed.S, **held)
    else:
        at = solver.Fixed("T,p", T=fixed.T, **held)
    end = solver.settle(species, feed, at)
    check_state(end, species, feed)
    check_lower_bound(end, species, feed)
    return end.V


def check_lower_bound(
    end: solver.EndState, species: list[Species], feed: dict[Species, float]
) -> None:
    """G is convex, so its tangent at the end state bounds it: no mixture may lie much lower.

    The linear program is solved to 1e-7 or so, far coarser than the solver's own gap, but
    shares nothing with it. In a held volume the end state is also that at its own pressure.
    """
    if not end.p > 0.0 or any(sp.charge for sp in species):
        return
    rows = sorted({e for sp in feed for e in sp.elements})
    N = sum(end.amounts[sp.key] for sp in species if sp.phase == "gas")
    # left out: elements that are not fed, and gases whose amount underflows
    species = [
        sp
        for sp in species
        if set(sp.elements) <= set(rows)
        and (sp.phase != "gas" or not N or end.amounts[sp.key] > 1e-280 * N)
    ]
    A, b = balances(species, feed, rows)
    n = np.array([end.amounts[sp.key] for sp in species])
    gas = np.array([sp.phase == "gas" for sp in species])
    mu = np.array([float(sp.g(end.T)) / (R * end.T) for sp in species])
    mu += np.array([sp.molar_volume or 0.0 if sp.phase != "gas" else 0.0 for sp in species]) * (
        (end.p - P0) / (R * end.T)
    )
    if N > 0.0:
        mu[gas] += np.log(n[gas] / N) + np.log(end.p / P0)
    else:
        mu[gas] += np.log(end.p / P0)
    if (b < 1e-5 * b.max()).any():
        return  # a trace that the linear program would not see
    found = linprog(mu, A_eq=A.T, b_eq=b / b.max(), bounds=(0, None))
    if found.fun is None:
        return
    scale = 1.0 + np.abs(mu[n > 0.0]).max()
    if (n @ mu / b.max() - found.fun) > 1e-6 * scale * max(n.sum() / b.max(), 1.0):
        raise Fault(f"a mixture lies {n @ mu / b.max() - found.fun:.1e} R T per mole lower")
