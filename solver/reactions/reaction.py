"""One reaction: its stoichiometric numbers, its text and its standard properties."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING, overload

import numpy as np
from numpy.typing import NDArray

from solver.core.mixture import R
from solver.errors import InputError
from solver.reactions.balance import tidy
from solver.reactions.text import EXAMPLE, check_balance, read_numbers, write

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]

T_STANDARD = 298.15  # K


@dataclass(frozen=True, slots=True)
class Reaction:
    """A balanced reaction; products count positive.

    Attributes
    ----------
    terms : tuple of (Species, Fraction)
        Species and their stoichiometric numbers, in the order they are written.

    Raises
    ------
    InputError
        It does not keep every element and the charge, or has no species on one side.
    """

    terms: tuple[tuple[Species, Fraction], ...]

    def __post_init__(self) -> None:
        numbers = dict(self.terms)
        if not any(nu < 0 for nu in numbers.values()) or not any(nu > 0 for nu in numbers.values()):
            raise InputError(
                "A reaction needs a species on either side.", "reaction", None, EXAMPLE
            )
        check_balance(numbers, "reaction", write(numbers))

    @classmethod
    def of(cls, numbers: Mapping[Species, float | Fraction]) -> Reaction:
        """From stoichiometric numbers (products positive); a float is taken as it is written."""
        exact: dict[Species, Fraction] = {}
        for sp, nu in numbers.items():
            if not isinstance(nu, Fraction) and not math.isfinite(nu):
                raise InputError(
                    f"The stoichiometric number of {sp.key} is {nu}; give a finite number.",
                    "reaction",
                    nu,
                    "a finite number",
                )
            exact[sp] = nu if isinstance(nu, Fraction) else Fraction(repr(float(nu)))
        return cls(tuple((sp, nu) for sp, nu in exact.items() if nu))

    @classmethod
    def parse(
        cls,
        text: str,
        species: Mapping[str, Species] | Iterable[Species],
        *,
        field: str = "reaction",
    ) -> Reaction:
        """Read a reaction such as ``CO + H2O = CO2 + H2`` or ``2 H2O(l) -> 2 H2 + O2``.

        Parameters
        ----------
        text : str
            Sides parted by ``=``, ``->``, ``<=>`` or an arrow sign; numbers whole, decimal or
            fractions. The numbers are kept as written.
        species : mapping of str to Species, or iterable of Species
            A library, or the species that may be named.
        field : str
            What an error calls the input.

        Raises
        ------
        InputError
            It cannot be read, names an unknown species or does not balance.
        """
        return cls(tuple(read_numbers(text, species, field).items()))

    @property
    def numbers(self) -> dict[Species, Fraction]:
        """Stoichiometric numbers, products positive."""
        return dict(self.terms)

    @property
    def species(self) -> tuple[Species, ...]:
        """The species in it, left side first."""
        return tuple(sp for sp, _ in self.terms)

    @property
    def text(self) -> str:
        """``CH4 + H2O = CO + 3 H2``; reads back to the same reaction."""
        return write(self.numbers)

    @property
    def pretty(self) -> str:
        """The text with lowered atom counts: ``CH₄ + H₂O = CO + 3 H₂``."""
        return write(self.numbers, subscripts=True)

    def __str__(self) -> str:
        return self.text

    @property
    def reversed(self) -> Reaction:
        """The reaction written the other way round."""
        return Reaction(tuple((sp, -nu) for sp, nu in self.terms))

    @property
    def whole(self) -> Reaction:
        """The same in the smallest whole numbers, or short decimals where there are none."""
        return Reaction(tuple(tidy(self.numbers).items()))

    @property
    def gas_change(self) -> float:
        """Sum of the stoichiometric numbers of the gases."""
        return float(sum(nu for sp, nu in self.terms if sp.phase == "gas"))

    @property
    def data_range(self) -> tuple[float, float]:
        """Temperatures, K, that the records of all its species cover; may be empty (low > high)."""
        return max(sp.T_min for sp in self.species), min(sp.T_max for sp in self.species)

    @overload
    def dh(self, T: float) -> float: ...
    @overload
    def dh(self, T: Array) -> Array: ...
    def dh(self, T: float | Array) -> float | Array:
        """Standard enthalpy of reaction, J/mol, at T in K (any shape)."""
        return self._change("h", T)

    @overload
    def ds(self, T: float) -> float: ...
    @overload
    def ds(self, T: Array) -> Array: ...
    def ds(self, T: float | Array) -> float | Array:
        """Standard entropy of reaction (1 bar), J/(mol K), at T in K (any shape)."""
        return self._change("s", T)

    @overload
    def dg(self, T: float) -> float: ...
    @overload
    def dg(self, T: Array) -> Array: ...
    def dg(self, T: float | Array) -> float | Array:
        """Standard Gibbs energy of reaction (1 bar), J/mol, at T in K (any shape)."""
        return self._change("g", T)

    @overload
    def dcp(self, T: float) -> float: ...
    @overload
    def dcp(self, T: Array) -> Array: ...
    def dcp(self, T: float | Array) -> float | Array:
        """Change of the heat capacity, J/(mol K), at T in K (any shape)."""
        return self._change("cp", T)

    @overload
    def ln_k(self, T: float) -> float: ...
    @overload
    def ln_k(self, T: Array) -> Array: ...
    def ln_k(self, T: float | Array) -> float | Array:
        """ln of the equilibrium constant, standard pressure 1 bar, at T in K (any shape)."""
        return -self.dg(T) / (R * T)

    def k(self, T: float) -> float:
        """Equilibrium constant, standard pressure 1 bar, at T in K; inf or 0 beyond the floats."""
        return exp(self.ln_k(T))

    def _change(self, name: str, T: float | Array) -> float | Array:
        total: float | Array = 0.0
        for sp, nu in self.terms:
            total = total + float(nu) * getattr(sp, name)(T)
        return total


def exp(value: float) -> float:
    """e to a power, inf rather than an error beyond the largest float."""
    return math.exp(value) if value < 709.0 else math.inf
