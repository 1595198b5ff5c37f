"""A bracketed root of a function of one variable, to the last digits."""

from __future__ import annotations

from collections.abc import Callable

_EPS = 2.220446049250313e-16


def bracketed_root(f: Callable[[float], float], a: float, b: float, fa: float, fb: float) -> float:
    """Root of f between a and b, where fa = f(a) and fb = f(b) differ in sign.

    Bisection with inverse quadratic steps where these are safe (T. R. Chandrupatla, Advances
    in Engineering Software 28, 1997, 145). The bracket closes to rounding. Values at the ends
    may be infinite.
    """
    if fa == 0.0:
        return a
    if fb == 0.0:
        return b
    if (fa > 0.0) == (fb > 0.0):
        raise ValueError("the function has the same sign at both ends")
    old, fold = a, fa
    share = 0.5
    for _ in range(300):
        x = a + share * (b - a)
        fx = f(x)
        if (fx > 0.0) == (fa > 0.0):
            old, fold = a, fa
        else:
            old, fold = b, fb
            b, fb = a, fa
        a, fa = x, fx
        best = a if abs(fa) < abs(fb) else b
        tolerance = 2.0 * _EPS * abs(best) + 1e-300
        limit = tolerance / abs(b - a) if a != b else 1.0
        if limit > 0.5 or fa == 0.0:
            return a if fa == 0.0 else best
        share = 0.5
        spread, rise = fb - fa, fold - fb
        if abs(spread) < 1e300 and abs(rise) < 1e300 and spread != 0.0 and fold != fa and rise != 0:
            xi, phi = (a - b) / (old - b), (fa - fb) / (fold - fb)
            if phi**2 < xi and (1.0 - phi) ** 2 < 1.0 - xi:
                share = -fa / spread * fold / rise
                share += (old - a) / (b - a) * fa / (fold - fa) * fb / rise
        share = min(max(share, limit), 1.0 - limit)
    return a if abs(fa) < abs(fb) else b
