"""Seven-coefficient polynomials: values, shifts and constrained fits.

Coefficients as in `species_db.Segment`; h below is h/R in K, s is s/R, both with R of 2019.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from species_db.species import R

R_1986 = 8.314510
"""Gas constant of CODATA 1986, to which the older polynomials are scaled, J/(mol K)."""
T0 = 298.15
KELVIN = 1000.0  # fits run in T/1000 for conditioning
CP_WEIGHT = 0.3
"""Weight of cp against h and s in a fit: g is what an equilibrium rests on."""


def cp_of(a: np.ndarray, T: np.ndarray | float) -> np.ndarray | float:
    return a[0] + T * (a[1] + T * (a[2] + T * (a[3] + T * a[4])))


def h_of(a: np.ndarray, T: np.ndarray | float) -> np.ndarray | float:
    return T * (a[0] + T * (a[1] / 2 + T * (a[2] / 3 + T * (a[3] / 4 + T * a[4] / 5)))) + a[5]


def s_of(a: np.ndarray, T: np.ndarray | float) -> np.ndarray | float:
    return a[0] * np.log(T) + T * (a[1] + T * (a[2] / 2 + T * (a[3] / 3 + T * a[4] / 4))) + a[6]


@dataclass
class Piece:
    """A temperature range and its coefficients."""

    low: float
    high: float
    a: np.ndarray

    def shifted(self, dh: float = 0.0, ds: float = 0.0) -> "Piece":
        """Copy with h/R raised by dh (K) and s/R by ds."""
        return replace(self, a=self.a + np.array([0, 0, 0, 0, 0, dh, ds]))


def piece_at(pieces: Sequence[Piece], T: float) -> Piece:
    """The piece that rules at T; the end pieces rule beyond the ends."""
    for piece in pieces:
        if piece.high > T:
            return piece
    return pieces[-1]


def h_at(pieces: Sequence[Piece], T: float) -> float:
    """h/R in K, cp constant beyond the ends."""
    t = min(max(T, pieces[0].low), pieces[-1].high)
    a = piece_at(pieces, t).a
    return float(h_of(a, t) + cp_of(a, t) * (T - t))


def s_at(pieces: Sequence[Piece], T: float) -> float:
    """s/R, cp constant beyond the ends."""
    t = min(max(T, pieces[0].low), pieces[-1].high)
    a = piece_at(pieces, t).a
    return float(s_of(a, t) + cp_of(a, t) * np.log(T / t))


def g_at(pieces: Sequence[Piece], T: float) -> float:
    """g/(RT), cp constant beyond the ends."""
    return h_at(pieces, T) / T - s_at(pieces, T)


def cp_at(pieces: Sequence[Piece], T: float) -> float:
    """cp/R, constant beyond the ends."""
    t = min(max(T, pieces[0].low), pieces[-1].high)
    return float(cp_of(piece_at(pieces, t).a, t))


def constant_cp(low: float, high: float, cp: float, h298: float, s298: float) -> list[Piece]:
    """One piece of constant cp through h298 and s298; SI arguments."""
    k = cp / R
    a = np.array([k, 0, 0, 0, 0, h298 / R - k * T0, s298 / R - k * np.log(T0)])
    return [Piece(low, high, a)]


def _rows(T: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Rows of cp/R, h/RT and s/R for coefficients in T/1000."""
    t = np.asarray(T, dtype=float) / KELVIN
    one, zero = np.ones_like(t), np.zeros_like(t)
    cp = np.stack([one, t, t**2, t**3, t**4, zero, zero], 1)
    h = np.stack([one, t / 2, t**2 / 3, t**3 / 4, t**4 / 5, 1 / t, zero], 1)
    s = np.stack([np.log(t), t, t**2 / 2, t**3 / 3, t**4 / 4, zero, one], 1)
    return cp, h, s


def _unscaled(x: np.ndarray) -> np.ndarray:
    a = np.array([x[i] / KELVIN**i for i in range(5)] + [x[5] * KELVIN, x[6]])
    a[6] -= x[0] * np.log(KELVIN)
    return a


@dataclass
class Fit:
    pieces: list[Piece]
    error_cp: float  # max |cp/R - tabulated|
    error_g: float  # max |g/RT - tabulated|


def fit(T: np.ndarray, cp: np.ndarray, h: np.ndarray, s: np.ndarray, anchor: int) -> Fit:
    """Least squares of cp/R, h/RT and s/R together over a table, in one to five pieces.

    h and s are met exactly at row `anchor`; cp, h and s are continuous between pieces. The first
    break is at 1000 K; more are put where cp is worst while the fit stays poorer than
    0.002 in g/RT or 1 % in cp.
    """
    breaks = [1000.0] if _holds(T, T.min(), 1000.0) and _holds(T, 1000.0, T.max()) else []
    best = _fit(T, cp, h, s, anchor, breaks)
    while len(breaks) < 4 and (best.error_g > 2e-3 or best.error_cp > 0.01 * cp.max()):
        error = np.array([abs(cp_at(best.pieces, t) - c) for t, c in zip(T, cp, strict=True)])
        edges = [T.min(), *breaks, T.max()]
        room = [
            t
            for t in T
            if all(_holds(T, *sorted((t, e)), at_least=4) for e in edges) and t not in breaks
        ]
        if not room:
            break
        worst = T[error.argmax()]
        breaks = sorted([*breaks, min(room, key=lambda t: abs(t - worst))])
        better = _fit(T, cp, h, s, anchor, breaks)
        if better.error_g > best.error_g and better.error_cp > best.error_cp:
            break
        best = better
    return best


def _holds(T: np.ndarray, low: float, high: float, at_least: int = 3) -> bool:
    return high - low > 50 and int(((low - 1e-9 <= T) & (high + 1e-9 >= T)).sum()) >= at_least


def _fit(
    T: np.ndarray, cp: np.ndarray, h: np.ndarray, s: np.ndarray, anchor: int, breaks: list[float]
) -> Fit:
    edges = [float(T.min()), *breaks, float(T.max())]
    n = len(edges) - 1
    rows, right = [], []
    used: list[np.ndarray] = []
    for k in range(n):
        inside = (edges[k] - 1e-9 <= T) & (edges[k + 1] + 1e-9 >= T)
        terms = min(5, max(1, int(inside.sum()) - (n > 1)))
        used.append(np.array([i for i in range(7) if i < terms or i >= 5]) + 7 * k)
        block = np.zeros((3 * inside.sum(), 7 * n))
        cp_rows, h_rows, s_rows = _rows(T[inside])
        block[:, 7 * k : 7 * k + 7] = np.vstack([CP_WEIGHT * cp_rows, h_rows, s_rows])
        rows.append(block)
        right.append(np.concatenate([CP_WEIGHT * cp[inside], h[inside], s[inside]]))
    exact, target = [], []
    for k, t in enumerate(breaks):
        for row in _rows(np.array([t])):
            line = np.zeros(7 * n)
            line[7 * k : 7 * k + 7] = row[0]
            line[7 * k + 7 : 7 * k + 14] = -row[0]
            exact.append(line)
            target.append(0.0)
    t = T[anchor]
    k = next(i for i in range(n) if t <= edges[i + 1] + 1e-9)
    for row, value in zip(_rows(np.array([t]))[1:], (h[anchor], s[anchor]), strict=True):
        line = np.zeros(7 * n)
        line[7 * k : 7 * k + 7] = row[0]
        exact.append(line)
        target.append(value)
    free = np.concatenate(used)
    x = np.zeros(7 * n)
    x[free] = _constrained(
        np.vstack(rows)[:, free], np.concatenate(right), np.array(exact)[:, free], np.array(target)
    )
    pieces = [Piece(edges[k], edges[k + 1], _unscaled(x[7 * k : 7 * k + 7])) for k in range(n)]
    e_cp = max(abs(cp_at(pieces, t) - c) for t, c in zip(T, cp, strict=True))
    e_g = max(abs(g_at(pieces, t) - (a - b)) for t, a, b in zip(T, h, s, strict=True))
    return Fit(pieces, float(e_cp), float(e_g))


def _constrained(A: np.ndarray, b: np.ndarray, E: np.ndarray, d: np.ndarray) -> np.ndarray:
    """Least squares of A x = b subject to E x = d (null-space method)."""
    _, sigma, Vt = np.linalg.svd(E)
    rank = int((sigma > 1e-12 * sigma[0]).sum())
    x0 = np.linalg.lstsq(E, d, rcond=None)[0]
    Z = Vt[rank:].T
    return x0 + Z @ np.linalg.lstsq(A @ Z, b - A @ x0, rcond=None)[0]


def smooth_join(pieces: Sequence[Piece]) -> list[Piece]:
    """Pieces with every later one shifted so that h and s are continuous at the joins."""
    out = [pieces[0]]
    for piece in pieces[1:]:
        T, low = piece.low, out[-1].a
        dh = float(h_of(low, T) - h_of(piece.a, T))
        ds = float(s_of(low, T) - s_of(piece.a, T))
        out.append(piece.shifted(dh, ds))
    return out
