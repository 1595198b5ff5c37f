"""A linear program over pure species and trial phases: which phases a real mixture has.

Columns are the condensed species, every fluid substance alone, and compositions of fluid
phases. Its potentials are put to the tangent-plane test; the phase found lowest becomes the
next column. The Gibbs energy falls each time, and the sequence comes to the phases of the
minimum from any start (decomposition principle of Dantzig and Wolfe), as far as the test
finds what lies below.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from solver.core.simplex import Simplex
from solver.real.problem import RealCases
from solver.real.stability import tangent_plane

Array = NDArray[np.float64]

_CLOSE = -1e-9
_DENSE = 0.2  # volume fraction b/v that parts gases from liquids among the columns
_UNLIKE = 0.2  # mole fraction by which two liquids differ
_NONE = 1e5


class Columns:
    """The program of one case."""

    def __init__(self, cases: RealCases) -> None:
        self._cases = cases
        mixture, gas = cases.mixture, cases.gas
        c = cases.ideal.c[0].copy()
        self._pure = cases.fluid.residual(cases.q[0], "least")
        c[gas] += (cases.q[0] * self._pure.grad).sum(axis=1)
        c[list(cases.real.stands_for)] = _NONE
        self._scale = float(cases.ideal.scale[0])
        self._program = Simplex(mixture.A, cases.feed.totals[0] / self._scale, c)
        self._program.run()
        self._trials: list[tuple[Array, float]] = []  # composition and volume fraction

    def improve(self) -> bool:
        """Add the trial phase that lies lowest; True where there is none to add."""
        cases, gas = self._cases, self._cases.gas
        d = (self._program.potentials @ cases.mixture.A[gas].T - cases.ideal.c[0, gas])[None, :]
        trials = tangent_plane(cases, d, np.ones(d.shape, dtype=bool), np.zeros((1, 1, gas.size)))
        if trials.distance[0] > _CLOSE:
            return True
        w = trials.w[0]
        M = w @ cases.q[0]
        residual = cases.fluid.residual(M[None, :], "least")
        log_phi = cases.q[0] @ residual.grad[0]
        some = w > 0.0
        cost = float(w[some] @ (cases.ideal.c[0, gas][some] + np.log(w[some]) + log_phi[some]))
        self._program.add(w @ cases.mixture.A[gas], cost)
        dense = float(M[1] / (M[0] * residual.Z[0])) if M[0] > 0.0 else 0.0
        self._trials.append((w, dense))
        self._program.run()
        return False

    def read(self) -> tuple[tuple[int, ...], dict[int, Array], Array]:
        """Condensed phases, amounts (gas species,) in each fluid slot, and potentials."""
        cases, gas = self._cases, self._cases.gas
        place = {int(species): k for k, species in enumerate(gas)}
        species = len(cases.mixture.species)
        active: list[int] = []
        parts: list[tuple[Array, float]] = []
        for j, level in zip(self._program.basis, self._program.levels, strict=True):
            if j < 0 or level <= 0.0:
                continue
            if j >= species:
                w, dense = self._trials[j - species]
                parts.append((w * level * self._scale, dense))
            elif j in place:
                k = place[j]
                M = cases.q[0, k]
                dense = float(M[1] / self._pure.Z[k]) if M[0] > 0.0 else 0.0
                w = np.zeros(gas.size)
                w[k] = level * self._scale
                parts.append((w, dense))
            else:
                active.append(j)
        fluids: dict[int, Array] = {}
        for w, _ in (part for part in parts if part[1] <= _DENSE):
            fluids[0] = fluids.get(0, np.zeros(gas.size)) + w
        for w, _ in (part for part in parts if part[1] > _DENSE):
            w = np.where(cases.modelled, w, 0.0)
            slot = 1
            if 1 in fluids:
                apart = np.abs(w / w.sum() - fluids[1] / fluids[1].sum()).max()
                slot = 1 if apart < _UNLIKE else 2
            fluids[slot] = fluids.get(slot, np.zeros(gas.size)) + w
        return tuple(sorted(active)), fluids, self._program.potentials
