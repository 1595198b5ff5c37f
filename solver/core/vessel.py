"""A held volume met by seeking the pressure: the certain way where the direct one fails.

At fixed T the volume of the minimum at T and p never rises with p, so the pressure that
fills the vessel is bracketed like a temperature. Where a phase evaporates at one pressure
the volume jumps, and the end state is the split of the two minima at the jump.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from solver.core.mixture import P0, Held, R

Array = NDArray[np.float64]
M = TypeVar("M")

_LOWEST, _HIGHEST = -600.0, 18.0  # ln p/p0
_CLOSED = 4e-15
_MAX_EVALUATIONS = 300


class TooSmall(ArithmeticError):
    """The contents need more than the vessel holds; `needed` is in m3, `what` says of which."""

    def __init__(
        self, needed: float, what: str = "the liquids and solids that must stay in it"
    ) -> None:
        super().__init__("the vessel is smaller than what must stay condensed in it")
        self.needed, self.what = needed, what


class Unfilled(ArithmeticError):
    """The search for the pressure did not end."""


def fill(
    minimum_at: Callable[[Held, M | None], M],
    amounts_of: Callable[[M], Array],
    gibbs_of: Callable[[M], float],
    gas: NDArray[np.intp],
    volume: Array,
    held: Held,
    log_p: float,
) -> tuple[M, Array, float]:
    """The minimum at T and p whose volume is the one held.

    Parameters
    ----------
    minimum_at : callable
        Minimum at a T and p, from a neighbour where there is one.
    amounts_of : callable
        Its amounts (species,).
    gibbs_of : callable
        Its Gibbs energy, J.
    gas : ndarray of int
        Gas species.
    volume : ndarray, shape (species,)
        Molar volumes of the condensed species, m3/mol.
    held : Held
        T and V.
    log_p : float
        First guess of ln p/p0.

    Returns
    -------
    tuple
        A minimum at that pressure, the amounts (species,), and the pressure, Pa.

    Raises
    ------
    TooSmall
        The vessel cannot hold what must stay condensed.
    Unfilled
        No end within the allowed evaluations.
    """
    assert held.V is not None
    ends: dict[bool, tuple[float, float, Array, M]] = {}  # by "needs more than the vessel"
    log_p = float(np.clip(log_p, _LOWEST, _HIGHEST))
    last: M | None = None
    slow = 0
    for _ in range(_MAX_EVALUATIONS):
        p = P0 * float(np.exp(log_p))
        last = minimum_at(Held(held.T, p=p), last)
        n = amounts_of(last)
        condensed = float(n @ volume)
        filled = float(n[gas].sum()) * R * held.T / p + condensed
        if abs(filled - held.V) <= _CLOSED * held.V:
            return last, n, p
        larger = filled > held.V
        if larger and log_p >= _HIGHEST:
            raise TooSmall(condensed)
        if not larger and log_p <= _LOWEST:
            return last, n, 0.0
        ends[larger] = (log_p, filled, n, last)
        if len(ends) < 2:
            # ideal gas: p V is constant; then wider steps until the volume is passed
            room = max(held.V - condensed, 1e-3 * held.V)
            step = float(np.log(max(filled - condensed, 1e-300) / room))
            slow += 1
            step = (1.0 if larger else -1.0) * min(max(abs(step), 1e-3 * 4.0**slow), 60.0)
            log_p = float(np.clip(log_p + step, _LOWEST, _HIGHEST))
            continue
        low, high = ends[True], ends[False]
        if high[0] - low[0] <= 4.0 * np.spacing(max(abs(high[0]), abs(low[0]), 1.0)):
            # each share by itself: one may be lost beside the other
            n = ((held.V - high[1]) * low[2] + (low[1] - held.V) * high[2]) / (low[1] - high[1])
            return high[3], n, P0 * float(np.exp(high[0]))
        # regula falsi on ln V, halving whenever it creeps
        with np.errstate(all="ignore"):
            slope = (np.log(high[1]) - np.log(low[1])) / (high[0] - low[0])
            proposal = low[0] + (np.log(held.V) - np.log(low[1])) / slope
        slow += 1
        if slow > 4 and slow % 3:
            proposal = _crossing(low, high, gibbs_of(low[3]), gibbs_of(high[3]), slow)
        elif slow % 2 or not low[0] < proposal < high[0]:
            proposal = 0.5 * (low[0] + high[0])
        log_p = float(proposal)
    raise Unfilled("no pressure fills the vessel")


def _crossing(
    low: tuple[float, float, Array, M],
    high: tuple[float, float, Array, M],
    G_low: float,
    G_high: float,
    tries: int,
) -> float:
    """ln p/p0 where the Gibbs energies of the two ends, carried on with their volumes, meet.

    That is the pressure of a transition, found quadratically; near an end the other side of
    it is taken, so that the bracket closes.
    """
    middle = 0.5 * (low[0] + high[0])
    p_low, p_high, p_middle = (P0 * float(np.exp(x)) for x in (low[0], high[0], middle))
    rise = (G_high + high[1] * (p_middle - p_high)) - (G_low + low[1] * (p_middle - p_low))
    p = p_middle + rise / (low[1] - high[1])
    reach = 2.0 ** (tries % 11) * np.spacing(max(abs(low[0]), abs(high[0]), 1.0))
    if not p_low < p < p_high:
        return middle
    x = float(np.clip(np.log(p / P0), low[0] + reach, high[0] - reach))
    return x if low[0] < x < high[0] else middle
