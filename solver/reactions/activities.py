"""Activities of a composition, standard pressure 1 bar, each with a word on where it is from."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING

import numpy as np

from solver.core.mixture import P0, R, condensed_volume
from solver.endstate import EndState
from solver.gas_model import GasModel, gas_model
from solver.reactions.reaction import Reaction

if TYPE_CHECKING:
    from species_db import Species

GAS = "y p / 1 bar"
REAL_GAS = "phi y p / 1 bar"
LEFT_OUT = "left out; by its substance in the fluid"
PURE = "pure phase, present"
ABSENT = "absent; activity at which it would be in equilibrium"
GIVEN = "absent; activity as given"
UNKNOWN = "absent; activity not known"
NO_GAS = "there is no gas"
NOT_THERE = "amount zero"
NO_CANDIDATE = "not among the candidates"


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
    gas: str | GasModel = "ideal",
) -> dict[Species, Activity]:
    """Activities of a composition: one gas or fluid, each condensed species its own phase.

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
    gas : str or GasModel
        Gas model; with an equation of state the gas species are one phase, the stable one.
    """
    model = gas_model(gas)
    total = math.fsum(n for sp, n in amounts.items() if sp.phase == "gas")
    real = not model.is_ideal and total > 0.0 and p > 0.0
    ln_phi = _ln_phi(amounts, T, p, model) if real else {}
    out = {}
    for sp, n in amounts.items():
        if sp.phase == "gas":
            if total <= 0.0 or p <= 0.0:
                out[sp] = Activity(None, NO_GAS)
            elif n <= 0.0:
                out[sp] = Activity(-math.inf, NOT_THERE)
            else:
                ln = math.log(n / total) + math.log(p / P0) + ln_phi.get(sp, 0.0)
                out[sp] = Activity(ln, REAL_GAS if real else GAS)
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


def _ln_phi(
    amounts: Mapping[Species, float], T: float, p: float, gas: GasModel
) -> dict[Species, float]:
    """ln of the fugacity coefficients of the gas species."""
    from solver.gas.fluid import make_fluid  # an ideal gas does without
    from solver.gas.properties import ln_phi

    gases = [sp for sp in amounts if sp.phase == "gas"]
    n = np.array([[amounts[sp] for sp in gases]])
    fluid = make_fluid(gases, gas.key, gas.among({sp.key for sp in gases}))
    values = ln_phi(fluid, np.array([T]), np.array([p]), n)[0]
    return dict(zip(gases, values.tolist(), strict=True))


def activities_at(end: EndState, extra: Sequence[Species] = ()) -> dict[Species, Activity]:
    """Activities at an end state; a condensed candidate that is absent has that of the proof.

    With an equation of state the gas species have those of the gas, or where there is none of
    the liquid: they are the same in both.

    Parameters
    ----------
    end : EndState
    extra : sequence of Species
        Species that are no candidates (amount zero).
    """
    amounts = {sp: end.amounts[sp.key] for sp in end.species}
    if end.fluids:
        first = next(iter(end.fluids.values()))
        amounts |= {sp: first[sp.key] for sp in end.species if sp.phase == "gas"}
    out = activities(
        amounts, end.T, end.p, of_absent=end.proof.absent, how_absent=ABSENT, gas=end.model
    )
    by_key = {sp.key: sp for sp in end.species}
    for liquid, gas in end.left_out.items():
        held = out[by_key[gas]].ln
        if held is not None:
            shift = (by_key[gas].g(end.T) - by_key[liquid].g(end.T)) / (R * end.T)
            out[by_key[liquid]] = Activity(held + float(shift), LEFT_OUT)
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
        if activity.how not in (GAS, REAL_GAS, PURE):
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
