"""A candidate list made ready for the minimiser, and one minimisation problem over it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import CHARGE, Basis, balance_rows, formula_vector, make_basis
from solver.core.columns import run_of
from solver.core.thermo import ThermoTable

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]

R = 8.314462618
P0 = 1.0e5  # Pa, standard pressure
_COLDEST = 100.0  # K; a search may pass where T + dT has no meaning


@dataclass(frozen=True, eq=False)
class Shift:
    """A reaction whose K is taken at T + dT, carried by the g of one species.

    Attributes
    ----------
    numbers : ndarray, shape (species,)
        Stoichiometric numbers, products positive.
    key : int
        Index of the species that carries the shift.
    """

    numbers: Array
    dT: float
    key: int


@dataclass(frozen=True, eq=False)
class Mixture:
    """Arrays of a candidate list; made once, used for every case.

    Attributes
    ----------
    A : ndarray, shape (species, rows)
        Formula matrix: element counts, and charge where there are ions.
    atoms : ndarray, shape (rows,)
        Weights w with a_i . w > 0 for every candidate: moving the element potentials along
        -w relaxes every condition of optimality at once (used by the proof).
    """

    species: tuple[Species, ...]
    rows: Mapping[str, int]
    A: Array
    is_gas: NDArray[np.bool_]
    thermo: ThermoTable
    volume: Array
    atoms: Array
    gas: NDArray[np.intp]
    condensed: NDArray[np.intp]
    gas_columns: slice | NDArray[np.intp]
    """The gas species again, as a slice where they stand in one run."""
    rank: int
    """Number of independent balances among the candidates."""
    shifts: tuple[Shift, ...] = ()
    twins: tuple[tuple[int, int], ...] = ()
    """Pairs of a species and its inert part, which are one in the entropy of mixing."""
    _bases: dict[tuple[int, ...], Basis] = field(default_factory=dict)

    def shifted(self, T: Array) -> Array:
        """What is added to g/RT of each species (cases, species) by reactions held apart."""
        out = np.zeros((len(T), len(self.species)))
        if self.shifts:
            at_T = self.thermo.gibbs(T)
            numbers = np.array([shift.numbers for shift in self.shifts])  # (reactions, species)
            keys = [shift.key for shift in self.shifts]
            wanted = np.column_stack(
                [
                    (self.thermo.gibbs(np.maximum(T + shift.dT, _COLDEST)) - at_T) @ shift.numbers
                    for shift in self.shifts
                ]
            )
            out[:, keys] = np.linalg.solve(numbers[:, keys], wanted.T).T
        return out

    def basis(self, members: Sequence[int]) -> Basis:
        """The balances over the given components, kept for the next case that asks."""
        key = tuple(sorted(int(i) for i in members))
        if key not in self._bases:
            if len(self._bases) > 500:
                self._bases.clear()
            self._bases[key] = make_basis(self.A, key)
        return self._bases[key]


def condensed_volume(species: Species) -> float:
    """Molar volume of a condensed species, m3/mol; zero for a gas or where none is known."""
    if species.phase == "gas" or species.molar_volume is None:
        return 0.0
    return float(species.molar_volume)


def make_mixture(
    species: Sequence[Species],
    rows: Mapping[str, int],
    A: Array,
    atoms: Array,
    shifts: tuple[Shift, ...] = (),
    twins: tuple[tuple[int, int], ...] = (),
) -> Mixture:
    """Gather the arrays of candidates over given balances."""
    is_gas = np.array([sp.phase == "gas" for sp in species], dtype=bool)
    return Mixture(
        species=tuple(species),
        rows=dict(rows),
        A=A,
        is_gas=is_gas,
        gas=np.flatnonzero(is_gas),
        gas_columns=run_of(np.flatnonzero(is_gas)),
        condensed=np.flatnonzero(~is_gas),
        rank=int(np.linalg.matrix_rank(A)) if len(species) else 0,
        thermo=ThermoTable(species),
        volume=np.array([condensed_volume(sp) for sp in species]),
        atoms=atoms,
        shifts=shifts,
        twins=twins,
    )


def charge_weight(species: Sequence[Species]) -> float:
    """Weight of the charge row in `atoms`: an electron has no atom, so it gets a little."""
    most = max((sp.charge for sp in species), default=1)
    return -1.0 / (2.0 * max(most, 1))


_KEPT: dict[tuple[int, ...], tuple[tuple[Species, ...], Mixture]] = {}


def mixture_of(species: Sequence[Species], fed: Sequence[Species]) -> Mixture:
    """The mixture of the candidates that can hold nothing but what is fed.

    Candidates with an element that the feed lacks are left out: their amount is zero.
    """
    key = (*map(id, species), 0, *map(id, fed))
    if key in _KEPT:
        return _KEPT[key][1]
    rows = balance_rows(fed)
    if any(sp.charge for sp in species) and CHARGE not in rows:
        rows[CHARGE] = len(rows)
    held = [sp for sp in species if all(element in rows for element in sp.elements)]
    held.sort(key=lambda sp: sp.phase != "gas")  # gases in one run: no copies of their columns
    A = np.array([formula_vector(sp, rows) for sp in held]).reshape(-1, len(rows))
    atoms = np.array([charge_weight(held) if name == CHARGE else 1.0 for name in rows])
    mixture = make_mixture(held, rows, A, atoms)
    if len(_KEPT) > 64:
        _KEPT.clear()
    _KEPT[key] = ((*species, *fed), mixture)  # the species stay alive, so do their ids
    return mixture


@dataclass(frozen=True)
class Held:
    """What the minimiser holds at one temperature: a pressure or a volume.

    Exactly one of `p` (Pa) and `V` (m3) is given.
    """

    T: float
    p: float | None = None
    V: float | None = None
