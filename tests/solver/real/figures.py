"""Figures of a real end state worked out anew, from amounts and fugacity coefficients alone."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

import solver
from solver.gas.fluid import Fluid, make_fluid
from solver.gas.properties import ln_phi
from species_db import Species
from tests.solver.peers.problems import pure_potentials

Array = NDArray[np.float64]

SURE = 1e-13  # of all moles: less says nothing of the element potentials


@dataclass(frozen=True, eq=False)
class Figures:
    """One end state with its own element potentials.

    Gas species count in every fluid phase; of the condensed ones, those that stand as phases of
    their own.
    """

    end: solver.EndState

    @cached_property
    def gases(self) -> list[Species]:
        return [s for s in self.end.species if s.phase == "gas"]

    @cached_property
    def condensed(self) -> list[Species]:
        left_out = self.end.left_out
        return [s for s in self.end.species if s.phase != "gas" and s.key not in left_out]

    @cached_property
    def elements(self) -> list[str]:
        return sorted({e for s in self.end.species for e in s.elements})

    def formulas(self, species: Sequence[Species]) -> Array:
        """Formula matrix, (species, elements)."""
        return np.array([[s.elements.get(e, 0.0) for e in self.elements] for s in species]).reshape(
            len(species), len(self.elements)
        )

    @cached_property
    def fluid(self) -> Fluid:
        return make_fluid(self.gases, self.end.gas)

    @cached_property
    def phases(self) -> dict[str, Array]:
        """mol of every gas species in each fluid phase."""
        return {
            name: np.array([held[s.key] for s in self.gases])
            for name, held in self.end.fluids.items()
        }

    @cached_property
    def solids(self) -> Array:
        return np.array([self.end.amounts[s.key] for s in self.condensed])

    @cached_property
    def total(self) -> float:
        return float(sum(self.end.amounts.values()))

    def potentials(self, n: Array, root: str = "least") -> Array:
        """mu/RT of every gas species in a fluid phase of amounts n."""
        T, p = np.array([self.end.T]), np.array([self.end.p])
        with np.errstate(divide="ignore"):
            mixing = np.log(n / n.sum())
        return self._pure_gases + mixing + ln_phi(self.fluid, T, p, n[None, :], root)[0]

    @cached_property
    def _pure_gases(self) -> Array:
        return pure_potentials(self.gases, self.end.T, self.end.p)

    @cached_property
    def _pure_condensed(self) -> Array:
        return pure_potentials(self.condensed, self.end.T, self.end.p)

    @cached_property
    def lagrange(self) -> Array:
        """Potential of every element, the best fit to all that is surely present.

        What that leaves open, where an element is exchanged by traces alone, the traces settle.
        """
        rows, mu, amounts = [], [], []
        for n in self.phases.values():
            there = n > 1e-250
            rows.append(self.formulas(self.gases)[there])
            mu.append(self.potentials(n)[there])
            amounts.append(n[there])
        there = self.solids > 0.0
        rows.append(self.formulas(self.condensed)[there])
        mu.append(self._pure_condensed[there])
        amounts.append(self.solids[there])
        A, right, n = np.concatenate(rows), np.concatenate(mu), np.concatenate(amounts)
        sure = n > SURE * self.total
        weight = np.sqrt(n[sure] / self.total)
        out = np.linalg.lstsq(A[sure] * weight[:, None], right[sure] * weight, rcond=1e-14)[0]
        _, sizes, axes = np.linalg.svd(A[sure])
        free = axes[int((sizes > 1e-10 * sizes[0]).sum()) :]
        if len(free) and not sure.all():
            rest = A[~sure] @ free.T
            out += free.T @ np.linalg.lstsq(rest, right[~sure] - A[~sure] @ out, rcond=1e-10)[0]
        return out

    def off_fluid(self, n: Array, root: str = "least") -> Array:
        """mu - a.lambda over RT of every gas species in a fluid phase of amounts n."""
        return self.potentials(n, root) - self._lagrange_gases

    @cached_property
    def _lagrange_gases(self) -> Array:
        return self.formulas(self.gases) @ self.lagrange

    @cached_property
    def off_condensed(self) -> Array:
        """The same of every condensed candidate that stands by itself."""
        return self._pure_condensed - self.formulas(self.condensed) @ self.lagrange

    def above(self, fluids: Sequence[tuple[Array, str]], solids: Array) -> float:
        """G/RT less b.lambda of any amounts; the roots are given beside the phases.

        At amounts that keep the elements this is G less a constant, without its large part.
        """
        out = float(solids @ self.off_condensed)
        for n, root in fluids:
            if n.sum() > 0.0:
                some = n > 0.0
                out += float(n[some] @ self.off_fluid(n, root)[some])
        return out
