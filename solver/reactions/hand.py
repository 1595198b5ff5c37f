"""The whole hand calculation of one reaction: table, extents, equilibrium, energy by terms."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from solver.errors import InputError
from solver.fed import checked_amount
from solver.fixed import PAIRS, Fixed, checked_value
from solver.reactions.hand_energy import Account, Term, account_of, find_state
from solver.reactions.independence import reaction_count
from solver.reactions.path import Path, Place
from solver.reactions.reaction import Reaction

if TYPE_CHECKING:
    from species_db import Species

ALLOWED_PAIRS = ("T,p", "T,V", "H,p", "U,V")
_TRIALS = 9


@dataclass(frozen=True, slots=True)
class Row:
    """A line of the stoichiometric table; amounts in mol.

    `fraction` is the mole fraction in the gas, None for a condensed species; `number` the
    stoichiometric number, 0 for what does not react.
    """

    species: Species
    number: float
    initial: float
    change: float
    end: float
    fraction: float | None


@dataclass(frozen=True, slots=True)
class Limit:
    """One end of the admissible extents: mol, what stops there, and ln Q - ln K towards it."""

    extent: float
    used_up: tuple[str, ...]
    off: float


@dataclass(frozen=True, slots=True)
class Trial:
    """ln Q and ln Q - ln K at an extent (mol) at the end temperature: its sign brackets."""

    extent: float
    ln_q: float
    off: float


@dataclass(frozen=True)
class HandCalculation:
    """Everything needed to follow one reaction with a calculator. SI, standard pressure 1 bar.

    Attributes
    ----------
    reaction : Reaction
    fixed : Fixed
    T, p, V : float
        End state: K, Pa, m3.
    T0 : float
        Temperature that the energy balance is taken apart at, K.
    extent : float
        mol, of the reaction as written.
    rows : tuple of Row
        Stoichiometric table; species that do not react come last.
    gas_initial, gas_end : float
        mol of all gas.
    limits : (Limit, Limit)
        Least and largest extent that leave no amount negative.
    trials : tuple of Trial
        Extents across that interval; ln Q - ln K rises along them and changes sign once.
    ln_k, ln_q : float
        At the end state. They differ where a pure phase is used up first.
    energy : Account
        Energy balance term by term.
    absent : mapping of str to float
        Activity of a pure phase of the reaction that is used up or never formed.
    notes : tuple of str
    """

    reaction: Reaction
    fixed: Fixed
    T: float
    p: float
    V: float
    T0: float
    extent: float
    rows: tuple[Row, ...]
    gas_initial: float
    gas_end: float
    limits: tuple[Limit, Limit]
    trials: tuple[Trial, ...]
    ln_k: float
    ln_q: float
    energy: Account
    absent: Mapping[str, float]
    notes: tuple[str, ...]

    @property
    def amounts(self) -> dict[str, float]:
        """mol at the end by key."""
        return {row.species.key: row.end for row in self.rows}

    @property
    def terms(self) -> tuple[Term, ...]:
        """Terms of the energy balance in the order they are worked out."""
        return self.energy.terms


def hand_calculation(
    reaction: Reaction,
    feed: Mapping[Species, float],
    fixed: Fixed,
    *,
    T0: float = 298.15,
    gas: str = "ideal",
) -> HandCalculation:
    """Carry one reaction to equilibrium by hand.

    Parameters
    ----------
    reaction : Reaction
    feed : mapping of Species to float
        mol; what does not take part in the reaction is inert.
    fixed : Fixed
        Pair held: T,p or T,V, or for an adiabatic vessel H,p or U,V.
    T0 : float
        Temperature to take the energy balance apart at, K; the result does not depend on it.
        With the temperature of the feed, nothing is left of the feed's own warmth.
    gas : str
        Gas model.

    Returns
    -------
    HandCalculation
        The same end state as `solver.settle` with only these species, where this is the only
        reaction they allow.

    Raises
    ------
    InputError
        Nothing to react, a pair that is not meant, a vessel smaller than what is in it.
    NoEndState
        No temperature has the energy held.
    """
    if gas != "ideal":
        raise InputError(
            f"The hand calculation is for ideal gases only, not for {gas!r}; choose ideal.",
            "gas",
            gas,
            "ideal",
        )
    if fixed.pair not in ALLOWED_PAIRS:
        raise InputError(
            f"A hand calculation holds one of {', '.join(ALLOWED_PAIRS)}, not {fixed.pair}.",
            "fixed.pair",
            fixed.pair,
            ", ".join(ALLOWED_PAIRS),
        )
    T0 = _checked_T0(T0)
    amounts = {sp: checked_amount(sp.key, n) for sp, n in feed.items()}
    amounts = {sp: n for sp, n in amounts.items() if n > 0.0}
    holds_volume = PAIRS[fixed.pair].holds_volume
    second = fixed.values[1]
    path = Path(
        reaction,
        amounts,
        p=None if holds_volume else second,
        V=second if holds_volume else None,
    )
    if path.width <= 0.0:
        missing = [path.species[i].key for i in (*path.low.used_up, *path.high.used_up)]
        raise InputError(
            f"The reaction {reaction.text} cannot run either way: the feed lacks "
            f"{' and '.join(dict.fromkeys(missing))}; feed a full left or right side.",
            "feed",
            ", ".join(dict.fromkeys(missing)),
            "an amount of every species of one side",
        )
    state = find_state(path, fixed)
    end = state.place
    ln_q = path.ln_q(end.amounts, state.T)
    absent = {
        path.species[i].key: math.exp(ln) for i, ln in path.ln_activity_of_absent(end).items()
    }
    N = float(end.amounts[path.is_gas].sum())
    p = path.pressure(end.amounts, state.T)
    return HandCalculation(
        reaction=reaction,
        fixed=fixed,
        T=state.T,
        p=p,
        V=state.volume,
        T0=T0,
        extent=end.extent,
        rows=_table(path, end),
        gas_initial=float(path.start[path.is_gas].sum()),
        gas_end=N,
        limits=_limits(path, state.T),
        trials=_trials(path, state.T),
        ln_k=reaction.ln_k(state.T),
        ln_q=ln_q,
        energy=account_of(path, state, fixed, T0),
        absent=absent,
        notes=_notes(path, end, state.plateau, absent),
    )


def _checked_T0(T0: float) -> float:
    try:
        return checked_value("T", T0)
    except InputError as error:
        raise InputError(str(error), "T0", T0, error.allowed) from None


def _table(path: Path, end: Place) -> tuple[Row, ...]:
    gas = float(end.amounts[path.is_gas].sum())
    return tuple(
        Row(
            species=sp,
            number=float(path.nu[i]),
            initial=float(path.start[i]),
            change=float(path.nu[i]) * end.extent,
            end=float(end.amounts[i]),
            fraction=float(end.amounts[i]) / gas if sp.phase == "gas" and gas > 0.0 else None,
        )
        for i, sp in enumerate(path.species)
    )


def _limits(path: Path, T: float) -> tuple[Limit, Limit]:
    out = []
    for stop in (path.low, path.high):
        keys = tuple(path.species[i].key for i in stop.used_up)
        out.append(Limit(stop.extent, keys, path.end(stop, T).off))
    return out[0], out[1]


def _trials(path: Path, T: float) -> tuple[Trial, ...]:
    out = []
    ln_k = path.reaction.ln_k(T)
    for k in range(1, _TRIALS + 1):
        place = path.at(path.low.extent + path.width * k / (_TRIALS + 1), T)
        out.append(Trial(place.extent, place.off + ln_k, place.off))
    return tuple(out)


def _notes(path: Path, end: Place, plateau: bool, absent: Mapping[str, float]) -> tuple[str, ...]:
    notes = []
    if reaction_count(path.species) > 1:
        notes.append("these species allow other reactions as well; here only the one given may run")
    if plateau:
        notes.append(
            "the temperature stays while the reaction or a transition takes up the energy; "
            "the energy balance gives the extent"
        )
    elif end.at_end is not None:
        gone = ", ".join(path.species[i].key for i in end.at_end.used_up)
        notes.append(f"runs to its end: {gone or 'no room'} is used up before K is reached")
    notes += [f"{key} is absent; its activity is {a:.4g}" for key, a in absent.items()]
    return tuple(notes)
