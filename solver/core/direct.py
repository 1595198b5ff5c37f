"""The temperature of one case by Newton's method on balances and energy together.

From the minimum at a first temperature the joint method leads to the temperature sought as
long as the same phases are present; where others form there, it starts again with those. The
minimum at the temperature reached is then computed like any other, so that nothing is taken
on trust. Transitions, and whatever else this does not close, are left to the bracketed
search, which goes on from the last minimum.
"""

from __future__ import annotations

import numpy as np

from solver.core.cases import Feed
from solver.core.joint import solve_joint
from solver.core.minimise import Present
from solver.core.mixture import Mixture, R
from solver.core.searches import Searches
from solver.core.temperature import Point, Search, find_temperature, point_at

_FIRST_T = 1000.0
_MAX_SETS = 4
_CLOSED = 2e-13


def seek_temperature(mixture: Mixture, feed: Feed, search: Search) -> Point:
    """The point that has the value searched; raises as `find_temperature`."""
    T = min(max(_FIRST_T, search.T_low), search.T_high)
    point = point_at(mixture, feed, search.held(T), None, None)
    for _ in range(_MAX_SETS):
        near = _joint(mixture, feed, search, point)
        if near is None:
            break
        T, present = near
        reached = point_at(mixture, feed, search.held(T), present, None)
        if _closes(reached, search):
            return reached
        same = reached.present.active == point.present.active
        point = reached
        if same:
            break
    return find_temperature(mixture, feed, search, point.T, point.present)


def _closes(point: Point, search: Search) -> bool:
    """Whether a point has the value searched, to rounding."""
    size = R * float(point.n.sum()) * (1.0 if search.variable == "S" else point.T)
    return abs(point.value(search.variable) - search.value) <= _CLOSED * size


def _joint(
    mixture: Mixture, feed: Feed, search: Search, point: Point
) -> tuple[float, Present] | None:
    """Temperature and start reached with the phases of a point, if any is inside the range."""
    start = point.present
    if start.log_p is not None:
        return None  # the volume was met through the pressure
    joint = solve_joint(
        mixture,
        feed,
        Searches.of_one(search),
        start.active,
        mixture.basis(start.members),
        np.array([point.T]),
        start.log_a[None, :],
        np.array([start.nu]),
    )
    T = float(joint.T[0])
    if not joint.closed[0] or not search.T_low < T < search.T_high:
        return None
    return T, Present(start.active, start.members, joint.log_a[0], float(joint.nu[0]))
