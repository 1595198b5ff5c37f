"""End states of many cases, as arrays."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    import pandas as pd

Array = NDArray[np.float64]


def _nothing() -> MappingProxyType[str, Any]:
    return MappingProxyType({})


@dataclass(frozen=True)
class EndStates:
    """Where many cases end up; SI. A case that could not be settled holds NaN.

    Attributes
    ----------
    pair : str
        The fixed pair.
    keys : tuple of str
        The candidates, in the order of the columns of `amounts`.
    T, p, V, H, U, S, G : ndarray, shape (cases,)
        K, Pa, m3, J, J, J/K, J.
    amounts : ndarray, shape (cases, species)
        mol.
    settled : ndarray of bool, shape (cases,)
    element_residual, energy_residual, gap : ndarray, shape (cases,)
        The proof of each case, as in `Proof`.
    why : mapping of int to str
        For each case that is not settled, the reason in a sentence.
    liquids : mapping of str to ndarray, shape (cases, species)
        With an equation of state: mol in its liquid phases, where any case has one; `amounts`
        counts them too.
    """

    pair: str
    keys: tuple[str, ...]
    T: Array
    p: Array
    V: Array
    H: Array
    U: Array
    S: Array
    G: Array
    amounts: Array
    settled: NDArray[np.bool_]
    element_residual: Array
    energy_residual: Array
    gap: Array
    why: Mapping[int, str]
    liquids: Mapping[str, Array] = field(default_factory=_nothing)

    def __len__(self) -> int:
        return len(self.T)

    def frame(self) -> pd.DataFrame:
        """One row a case: T, p, V, H, U, S, G, settled, then mol of each candidate."""
        import pandas as pd  # not needed to settle, and slow to import

        state = {name: getattr(self, name) for name in ("T", "p", "V", "H", "U", "S", "G")}
        columns = dict(zip(self.keys, self.amounts.T, strict=True))
        return pd.DataFrame({**state, "settled": self.settled, **columns})
