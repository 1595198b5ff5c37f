"""The what-if line: end states over a range of temperatures, for the plot."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from time import perf_counter
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from gui.jobs import Stopped
from solver.project.model import Case
from solver.project.units import to_si
from solver.project.wording import formula_text

if TYPE_CHECKING:
    from solver.project.case import CaseAnswer

POINTS = 121
PART = 41
"""Points that are settled in one batch."""


@dataclass(frozen=True, slots=True)
class Line:
    """Shares of all moles against temperature.

    T, shape (points,), K; shares, shape (points, species); `stable` marks the points where a
    condensed phase is present, by key; NaN where a point could not be settled.
    """

    T: NDArray[np.float64]
    keys: tuple[str, ...]
    shares: NDArray[np.float64]
    condensed: tuple[str, ...]
    failed: int
    seconds: float
    held: str
    """What is held besides T, in words of the axis: 'p' or 'V' and its SI value."""
    value: float
    fluids: tuple[tuple[str, NDArray[np.bool_]], ...] = ()
    """Liquids of the equation of state, each with the points where it is present, (points,)."""


def range_of(case: Case) -> tuple[float, float]:
    """The plot's range in K; raises UnitError with the field's path."""
    low = to_si(case.plot.T_from, "temperature", "plot.T_from")
    high = to_si(case.plot.T_to, "temperature", "plot.T_to")
    return low, high


def composition_line(
    answer: CaseAnswer,
    low: float,
    high: float,
    progress: Callable[[float], None],
    should_stop: Callable[[], bool],
    points: int | None = None,
    settle_many: Any = None,
) -> Line:
    """Settle `answer`'s feed over temperatures from `low` to `high` (K).

    Pressure is that of the end state; where the case holds the volume, the volume is held. What
    the case holds back is held back all along the line.
    The points go to the solver in parts, so that a long line tells of its progress and can stop.
    """
    if settle_many is None:
        from solver import settle_many
    began = perf_counter()
    points = POINTS if points is None else points
    end = answer.end
    sealed = end.fixed.pair.endswith("V")
    pair, held = ("T,V", end.V) if sealed else ("T,p", end.p)
    species = list(answer.prepared.candidates)
    feed = dict(answer.prepared.feed)
    keys = tuple(sp.key for sp in species)
    T = np.linspace(low, high, points)
    shares = np.full((points, len(keys)), np.nan)
    liquids: dict[str, NDArray[np.bool_]] = {}
    failed = 0
    for start in range(0, points, PART):
        if should_stop():
            raise Stopped
        part = slice(start, min(start + PART, points))
        ends = settle_many(
            species,
            feed,
            pair,
            T[part],
            np.full(T[part].size, held),
            gas=answer.prepared.gas,
            restrictions=answer.prepared.restrictions,
        )
        shares[part] = ends.amounts / ends.amounts.sum(axis=1, keepdims=True)
        for name, amounts in ends.liquids.items():
            there = liquids.setdefault(name, np.zeros(points, dtype=bool))
            there[part] = np.nan_to_num(amounts).sum(axis=1) > 0.0
        failed += int((~ends.settled).sum())
        progress(part.stop / points)
    condensed = tuple(sp.key for sp in species if sp.phase != "gas")
    return Line(
        T,
        keys,
        shares,
        condensed,
        failed,
        perf_counter() - began,
        "V" if sealed else "p",
        held,
        tuple(liquids.items()),
    )


def shown_keys(line: Line, logarithmic: bool, most: int = 14) -> list[str]:
    """The species worth a curve, the most abundant first."""
    if not line.keys:
        return []
    with np.errstate(all="ignore"):
        top = np.nanmax(np.where(np.isnan(line.shares), 0.0, line.shares), axis=0)
    least = 1e-6 if logarithmic else 4e-3
    order = [i for i in np.argsort(-top) if top[i] >= least]
    return [line.keys[i] for i in order[:most]]


def phase_changes(line: Line) -> list[tuple[float, str]]:
    """Temperatures (K) at which liquids and condensed phases appear or go on heating, in words.

    Changes between the same two points share a place: "Fe3O4(s) gone, Fe(s) forms".
    """
    words: dict[int, list[str]] = {}
    found = [
        (formula_text(key), line.shares[:, line.keys.index(key)] > 0) for key in line.condensed
    ]
    for name, present in (*found, *line.fluids):
        for i in np.flatnonzero(present[1:] != present[:-1]):
            text = f"{name} {'forms' if present[i + 1] else 'gone'}"
            words.setdefault(int(i), []).append(text)
    return [
        (float(line.T[i] + line.T[i + 1]) / 2, _joined(sorted(texts, key=_gone_first)))
        for i, texts in sorted(words.items())
    ]


def _joined(texts: list[str], most: int = 2) -> str:
    more = f" and {len(texts) - most} more" if len(texts) > most else ""
    return ", ".join(texts[:most]) + more


def _gone_first(text: str) -> tuple[bool, str]:
    return text.endswith("forms"), text
