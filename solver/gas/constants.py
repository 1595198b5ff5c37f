"""Critical constants of the gas candidates: which are used, refused or missing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.errors import InputError

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

# Shipped values past these are estimates for the vapour of a salt or placeholders: the lowest
# measured acentric factor is helium's, -0.38, and none is zero to five digits. Common practice, no
# source.
HOTTEST_SHIPPED = 1000.0
LEAST_ACENTRIC_SHIPPED = -0.4
NO_ACENTRIC = 1e-5
NOBLE = frozenset({"He", "Ne", "Ar", "Kr", "Xe", "Rn"})
# field: lowest and highest that can be meant, unit; common practice, no source
LIMITS: dict[str, tuple[float, float, str]] = {
    "Tc": (0.0, 3000.0, "K"),
    "pc": (0.0, 1.0e8, "Pa"),
    "acentric": (-0.6, 2.0, ""),
}


@dataclass(frozen=True)
class CriticalConstants:
    """Critical constants of S species, nan where a record has none.

    Tc in K, pc in Pa, acentric factor, each (S,); known: all three are there; modelled: they are
    used in the equation of state.
    """

    Tc: Array
    pc: Array
    acentric: Array
    known: Flags
    modelled: Flags


def critical_constants(species: Sequence[Species]) -> CriticalConstants:
    """Constants of gas species, in their order.

    Raises
    ------
    InputError
        For a value outside its limits or nan in a record of the user's own.
    """
    columns = {name: np.full(len(species), np.nan) for name in LIMITS}
    modelled = np.zeros(len(species), dtype=bool)
    for i, sp in enumerate(species):
        sound = True
        for name in LIMITS:
            value = getattr(sp, name)
            if value is None:
                sound = False
                continue
            columns[name][i] = value
            if not _within(name, float(value)):
                if sp.source == "user":
                    _refuse(sp, name, value)
                sound = False
        modelled[i] = sound and may_be_modelled(sp)
    known = np.all([np.isfinite(column) for column in columns.values()], axis=0)
    return CriticalConstants(
        Tc=columns["Tc"],
        pc=columns["pc"],
        acentric=columns["acentric"],
        known=known,
        modelled=modelled,
    )


def may_be_modelled(sp: Species) -> bool:
    """Whether critical constants can mean anything for this species.

    Not for ions and electrons, whose forces reach far, and not for a single atom other than a
    noble gas: constants listed for atomic sulfur or phosphorus are those of the boiling element,
    whose vapour is S8 or P4. Of the shipped records, not those with an estimate or a placeholder.
    """
    atoms = sum(sp.elements.values())
    if sp.charge != 0 or (atoms <= 1 and next(iter(sp.elements)) not in NOBLE):
        return False
    if sp.source == "user" or sp.Tc is None or sp.acentric is None:
        return True
    return (
        sp.Tc <= HOTTEST_SHIPPED
        and sp.acentric >= LEAST_ACENTRIC_SHIPPED
        and abs(sp.acentric) >= NO_ACENTRIC
    )


def _within(name: str, value: float) -> bool:
    low, high, _ = LIMITS[name]
    return low < value <= high


def _refuse(sp: Species, name: str, value: float) -> None:
    low, high, unit = LIMITS[name]
    allowed = f"above {low:g} and at most {high:g} {unit}".rstrip()
    raise InputError(
        f"{sp.key}: {name} = {value:g} {unit}".rstrip()
        + f" cannot be right for a gas; give a value {allowed}, or none at all and the species "
        "is taken as ideal in the mixture",
        field=f"species[{sp.key}].{name}",
        value=value,
        allowed=allowed,
    )
