"""Least Gibbs energy of real mixtures at given T and p, many cases at once.

The ideal minimum gives the start: its gas, and a liquid of what it holds as pure liquids
that the equation of state models. Cases that share their phases are solved in one pass by
Newton's method. A phase with nothing left goes, a condensed species with a driving force
comes in, and the tangent-plane test brings in a fluid phase that lowers the Gibbs energy.
What this does not end is settled alone, its phases named by a linear program (`columns`).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from solver.core.batch import minimise_many
from solver.core.minimise import NotHeld, Unsettled, minimise
from solver.core.mixture import Held
from solver.core.simplex import Endless
from solver.real.columns import Columns
from solver.real.judge import CALM_ENTERED, Judge, chosen_members
from solver.real.newton import solve_phases
from solver.real.problem import ROOTS, RealCases
from solver.real.states import Minima, PhaseSet

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_MAX_ROUNDS = 16
_CALM_GAS, _CALM_LIQUID = 1, 2  # steps by substitution from an ideal start
_ATTEMPTS = (2, 4, 8, 16, 32, 64)


def minimise_real(cases: RealCases, features: Array, start: Minima | None = None) -> Minima:
    """Settle all cases.

    Parameters
    ----------
    cases : RealCases
    features : ndarray, shape (cases, any)
        Coordinates in which near cases have similar minima.
    start : Minima, optional
        Of the same cases at a slightly other T and p.
    """
    out = Minima.none_of(cases)
    calm = np.zeros(len(cases), dtype=np.intp)
    if start is None:
        _start_cold(cases, features, out)
        liquid = np.isfinite(out.nu[:, 1:]).any(axis=1)
        calm[:] = np.where(liquid, _CALM_LIQUID, _CALM_GAS)
    else:
        known = np.flatnonzero(start.found)
        out.sets = list(start.sets)
        for name in ("of", "log_a", "nu", "theta"):
            getattr(out, name)[known] = getattr(start, name)[known]
    _follow(cases, np.flatnonzero(out.of >= 0), out, calm)
    for i in np.flatnonzero(~out.found):
        if int(i) not in out.why:
            _settle_alone(cases, int(i), out)
    return out


def _start_cold(cases: RealCases, features: Array, out: Minima) -> None:
    """Phases and potentials from the ideal minima."""
    ideal, mixture = cases.ideal, cases.mixture
    if len(cases) == 1:
        try:
            found = minimise(mixture, cases.feed, Held(float(cases.T[0]), p=float(cases.p[0])))
        except (NotHeld, Unsettled, np.linalg.LinAlgError) as error:
            out.why[0] = error
            return
        sets = [(found.present.active, found.present.members)]
        of, n, potentials = np.zeros(1, dtype=np.intp), found.n[None, :], found.potentials[None, :]
    else:
        minima = minimise_many(ideal, features)
        sets, of, n, potentials = minima.sets, minima.of, minima.n, minima.potentials
        of = np.where(minima.found, of, -1)
        out.why.update(minima.why)
    liquids = list(cases.real.stands_for)
    gases = [cases.real.stands_for[i] for i in liquids]
    place = {int(species): k for k, species in enumerate(cases.gas)}
    for number, (active, members) in enumerate(sets):
        rows = np.flatnonzero(of == number)
        if not rows.size:
            continue
        own = tuple(sorted(cases.real.stands_for.get(m, m) for m in members))
        rest = tuple(i for i in active if i not in cases.real.stands_for)
        slots: tuple[int, ...] = (0,) if n[rows[0], cases.gas].any() else ()
        if len(rest) < len(active):
            slots = (*slots, 1)
        out.of[rows] = out.number(PhaseSet(rest, own, slots))
        mu = potentials[rows] @ mixture.A[list(own)].T
        out.log_a[rows] = mu - ideal.c[np.ix_(rows, np.array(own, dtype=np.intp))]
        for slot in slots:
            fluid = np.zeros((len(rows), cases.gas.size))
            if slot == 0:
                fluid = n[np.ix_(rows, cases.gas)]
            else:
                fluid[:, [place[g] for g in gases]] = n[np.ix_(rows, np.array(liquids))]
            _begin(cases, rows, slot, fluid, out)
        if slots:
            theta = out.theta[rows, slots[0]]
            for k, member in enumerate(own):
                if member in place and member not in rest:
                    q = cases.q[rows, place[member]]
                    out.log_a[rows, k] += (q * theta).sum(axis=1) if slots[0] == 0 else 0.0


def _begin(cases: RealCases, rows: Indices, slot: int, fluid: Array, out: Minima) -> None:
    """Size and fugacity coefficients of a fluid phase of given amounts (rows, gas species)."""
    total = fluid.sum(axis=1)
    share = fluid / total[:, None]
    residual = cases.fluid.residual(cases.moments(share, rows), ROOTS[slot])
    out.nu[rows, slot], out.theta[rows, slot] = np.log(total), residual.grad


def _follow(cases: RealCases, going: Indices, out: Minima, calm: Indices) -> None:
    """Follow the sets of the given cases to their minima; what is lost stays unfound."""
    for _ in range(_MAX_ROUNDS):
        if not going.size:
            return
        onward: list[Indices] = []
        for number in np.unique(out.of[going]):
            group = going[out.of[going] == number]
            chosen = out.sets[number]
            slots = np.array(chosen.fluids, dtype=np.intp)
            part = cases if len(group) == len(cases) else cases.of(group)
            for rows, solved in solve_phases(
                part,
                chosen,
                out.log_a[group],
                out.nu[np.ix_(group, slots)],
                out.theta[np.ix_(group, slots)],
                int(calm[group].max()),
            ):
                calm[group[rows]] = 0
                judge = Judge(cases, group[rows], chosen, solved, out, calm)
                onward += judge.onward()
        going = np.concatenate(onward) if onward else np.zeros(0, dtype=np.intp)


def _settle_alone(cases: RealCases, i: int, out: Minima) -> None:
    """One case whose phases a linear program over trial phases names."""
    one = cases.of(np.array([i]))
    own = Minima.none_of(one)
    try:
        columns = Columns(one)
        for attempt in range(max(_ATTEMPTS) + 1):
            finished = columns.improve()
            if attempt not in _ATTEMPTS and not finished:
                continue
            active, fluids, potentials = columns.read()
            preference = np.full(len(cases.mixture.species), -700.0)
            total = sum(fluids.values(), start=np.zeros(cases.gas.size))
            preference[cases.gas] = np.log(np.maximum(total, 1e-300))
            members = chosen_members(one, active, preference)
            own.of[0] = own.number(PhaseSet(active, members, tuple(sorted(fluids))))
            at = np.array(members)
            own.log_a[0] = potentials @ cases.mixture.A[at].T - one.ideal.c[0, at]
            for slot, amounts in fluids.items():
                _begin(one, np.zeros(1, dtype=np.intp), slot, amounts[None, :], own)
            _follow(one, np.zeros(1, dtype=np.intp), own, np.array([CALM_ENTERED]))
            apart = own.apart.pop(0, None)
            if own.found[0] or (finished and apart is None):
                break
            for w in apart if apart is not None else ():
                columns.add(w)
    except Endless as error:
        own.why[0] = Unsettled(str(error))
    if not own.found[0] and not own.why:
        own.why[0] = Unsettled("no end of the search for the phases of the real mixture")
    out.take(np.array([i]), own)
