"""Activities of a composition, standard pressure 1 bar, each with a word on where it is from."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING

from solver.core.mixture import P0, R, condensed_volume
from solver.endstate import EndState
from solver.errors import InputError
from solver.reactions.reaction import Reaction

if TYPE_CHECKING:
    from species_db import Species

GAS = "y p / 1 bar"
PURE = "pure phase, present"
ABSENT = "absent; activity at which it would be in equilibrium"
GIVEN = "absent; activity as given"
UNKNOWN = "absent; activity not known"
NO_GAS = "there is no gas"
NOT_THERE = "amount zero"
NO_CANDIDATE = "not among the candidates"


def check_ideal(gas: str) -> None:
    """Refuse any gas model but the ideal one: y p would not be its activity."""
    if gas != "ideal":
        raise InputError(
            f"Reactions are worked out for the ideal gas only, not for {gas!r}; choose ideal.",
            "gas",
            gas,
            "ideal",
        )


@dataclass(frozen=True, slots=True)
class Activity:
    """ln of an activity and where it comes from.

    Attributes
    ----------
    ln : float or None
        -inf where the amount is zero; None where there is no way to tell.
    how : str
    """

    ln: float | None
    how: str


def activities(
    amounts: Mapping[Species, float],
    T: float,
    p: float,
    *,
    of_absent: Mapping[str, float] = MappingProxyType({}),
    how_absent: str = GIVEN,
    gas: str = "ideal",
) -> dict[Species, Activity]:
    """Activities of a composition: ideal gas, each condensed species a phase of its own.

    Parameters
    ----------
    amounts : mapping of Species to float
        mol.
    T, p : float
        K, Pa.
    of_absent : mapping of str to float
        Activities of condensed species that are not there, relative to the pure phase at p.
    how_absent : str
        Where those come from.
    gas : str
        Gas model.
    """
    check_ideal(gas)
    total = math.fsum(n for sp, n in amounts.items() if sp.phase == "gas")
    out = {}
    for sp, n in amounts.items():
        if sp.phase == "gas":
            if total <= 0.0 or p <= 0.0:
                out[sp] = Activity(None, NO_GAS)
            elif n <= 0.0:
                out[sp] = Activity(-math.inf, NOT_THERE)
            else:
                out[sp] = Activity(math.log(n / total) + math.log(p / P0), GAS)
            continue
        # what pressure does to a phase of constant molar volume
        pressed = condensed_volume(sp) * (p - P0) / (R * T)
        if n > 0.0:
            out[sp] = Activity(pressed, PURE)
        elif of_absent.get(sp.key, 0.0) > 0.0:
            out[sp] = Activity(math.log(of_absent[sp.key]) + pressed, how_absent)
        else:
            out[sp] = Activity(None, UNKNOWN)
    return out


def activities_at(end: EndState, extra: tuple[Species, ...] = ()) -> dict[Species, Activity]:
    """Activities at an end state; a condensed candidate that is absent has that of the proof.

    Parameters
    ----------
    end : EndState
    extra : tuple of Species
        Species that are no candidates (amount zero).
    """
    amounts = {sp: end.amounts[sp.key] for sp in end.species}
    out = activities(
        amounts, end.T, end.p, of_absent=end.proof.absent, how_absent=ABSENT, gas=end.gas
    )
    for sp in extra:
        if sp not in amounts:
            out[sp] = Activity(-math.inf, NO_CANDIDATE)
    return out


def ln_quotient(
    reaction: Reaction, known: Mapping[Species, Activity]
) -> tuple[float | None, tuple[str, ...]]:
    """ln Q of a reaction, or None, and notes on every species that is not plainly present."""
    total: float | None = 0.0
    notes = []
    for sp, nu in reaction.terms:
        activity = known.get(sp, Activity(None, UNKNOWN))
        if activity.how not in (GAS, PURE):
            shown = "" if activity.how != ABSENT else f", {exp_text(activity.ln)}"
            notes.append(f"{sp.key}: {activity.how}{shown}")
        if activity.ln is None or total is None:
            total = None
            continue
        total += float(nu) * activity.ln  # inf and -inf together give nan: no quotient
    if total is not None and math.isnan(total):
        total = None
    return total, tuple(notes)


def exp_text(ln: float | None) -> str:
    """An activity in four digits."""
    return "" if ln is None else f"{math.exp(ln):.4g}"
