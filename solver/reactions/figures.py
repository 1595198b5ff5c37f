"""Reactions at an end state or at a measured composition: extents, K, Q, heats, approach."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from solver.endstate import EndState
from solver.errors import InputError
from solver.fed import checked_amount
from solver.fixed import checked_value
from solver.gas_model import GasModel
from solver.reactions.activities import Activity, activities, activities_at, ln_quotient
from solver.reactions.approach import Approach, equilibrium_temperature
from solver.reactions.extents import Extents, extents_of
from solver.reactions.independence import check_independent
from solver.reactions.matter import MATTERS, chosen_set, species_that_matter
from solver.reactions.reaction import T_STANDARD, Reaction, exp

if TYPE_CHECKING:
    from species_db import Species


@dataclass(frozen=True)
class Figures:
    """One reaction at a given T, p and composition. Standard pressure 1 bar; J, mol, K.

    Attributes
    ----------
    reaction : Reaction
    T, p : float
        K, Pa.
    extent : float or None
        mol from the feed; None where no feed was given.
    ln_k : float
        ln K(T).
    ln_q : float or None
        ln of the reaction quotient; None where an activity is not known.
    dh, ds, dg, dcp : float
        Standard enthalpy (J/mol), entropy (J/(mol K)), Gibbs energy (J/mol) and heat capacity
        (J/(mol K)) of the reaction at T.
    dh298, ds298, dg298 : float
        The same at 298.15 K.
    approach : Approach
        The temperature at which K = Q, and how far T is from it.
    notes : tuple of str
        What had to be assumed of a species that is not plainly present, and data out of range.
    """

    reaction: Reaction
    T: float
    p: float
    extent: float | None
    ln_k: float
    ln_q: float | None
    dh: float
    ds: float
    dg: float
    dcp: float
    dh298: float
    ds298: float
    dg298: float
    approach: Approach
    notes: tuple[str, ...] = ()

    @property
    def k(self) -> float:
        """K(T)."""
        return exp(self.ln_k)

    @property
    def q(self) -> float | None:
        """Reaction quotient."""
        return None if self.ln_q is None else exp(self.ln_q)

    @property
    def q_over_k(self) -> float | None:
        """Q/K: 1 at equilibrium, below 1 where the reaction would go on to the right."""
        return None if self.ln_q is None else exp(self.ln_q - self.ln_k)


@dataclass(frozen=True)
class ReactionsView:
    """An independent reaction set at an end state.

    Attributes
    ----------
    figures : tuple of Figures
        One for each reaction.
    species : tuple of Species
        Those that matter: fed, or present in more than traces.
    left_out : mapping of str to float
        mol of each candidate that is present in traces only.
    extents : Extents
        With what the set does not explain.
    """

    figures: tuple[Figures, ...]
    species: tuple[Species, ...]
    left_out: Mapping[str, float]
    extents: Extents

    @property
    def reactions(self) -> tuple[Reaction, ...]:
        """The reactions themselves."""
        return tuple(f.reaction for f in self.figures)

    @property
    def complete(self) -> bool:
        """Whether there are as many reactions as the species that matter allow."""
        return self.extents.missing <= 0


def reactions_at(
    end: EndState,
    feed: Mapping[Species | str, float],
    reactions: Sequence[Reaction] | None = None,
    *,
    share: float = MATTERS,
) -> ReactionsView:
    """The reactions behind an end state, with everything needed to check it by hand.

    Parameters
    ----------
    end : EndState
    feed : mapping of Species or str to float
        mol, as given to `solver.settle`.
    reactions : sequence of Reaction, optional
        The user's own set; a readable set is chosen where it is left out.
    share : float
        A species present in less than this share of all moles (and that holds less than a
        thousandth of each of its elements) is left out of the chosen set.

    Raises
    ------
    InputError
        A fed key is no candidate, or one of the user's reactions follows from the others.
    """
    fed = fed_species(end, feed)
    amounts = {sp: end.amounts[sp.key] for sp in end.species}
    amounts |= {sp: 0.0 for sp in fed if sp not in amounts}
    if reactions is None:
        species = species_that_matter(amounts, fed, share)
        chosen = chosen_set(species, fed, amounts)
    else:
        check_independent(reactions)
        chosen = tuple(reactions)
        named = [sp for reaction in chosen for sp in reaction.species]
        matter = species_that_matter(amounts, fed, share)
        species = tuple(dict.fromkeys([*matter, *named]))
        amounts |= {sp: 0.0 for sp in named if sp not in amounts}
    extents = extents_of(chosen, fed, amounts, species)
    known = activities_at(end, tuple(amounts))
    figures = tuple(
        _figures(reaction, end.T, end.p, extent, known)
        for reaction, extent in zip(chosen, extents.values, strict=True)
    )
    listed = {sp.key for sp in species}
    left_out = {sp.key: n for sp, n in amounts.items() if n > 0.0 and sp.key not in listed}
    return ReactionsView(figures, species, left_out, extents)


def reaction_figures(
    reaction: Reaction,
    amounts: Mapping[Species, float],
    T: float,
    p: float,
    *,
    feed: Mapping[Species, float] | None = None,
    absent: Mapping[str, float] | None = None,
    gas: str | GasModel = "ideal",
) -> Figures:
    """One reaction at a measured or partly reacted composition.

    Parameters
    ----------
    reaction : Reaction
    amounts : mapping of Species to float
        mol, or mole fractions of the gas; all gas species, inert ones too.
    T, p : float
        K, Pa.
    feed : mapping of Species to float, optional
        mol; the extent is then given too (the best fit of this one reaction).
    absent : mapping of str to float, optional
        Activities to take for condensed species that are not there (1: about to form).
    gas : str or GasModel
        Gas model.

    Raises
    ------
    InputError
        An amount, T or p is out of range.
    """
    T, p = checked_value("T", T), checked_value("p", p)
    checked = {sp: _amount(sp, n) for sp, n in amounts.items()}
    checked |= {sp: 0.0 for sp in reaction.species if sp not in checked}
    known = activities(checked, T, p, of_absent=absent or {}, gas=gas)
    extent = None
    if feed is not None:
        fed = {sp: checked_amount(sp.key, n) for sp, n in feed.items()}
        extent = extents_of([reaction], fed, checked).values[0]
    return _figures(reaction, T, p, extent, known)


def _figures(
    reaction: Reaction, T: float, p: float, extent: float | None, known: Mapping[Species, Activity]
) -> Figures:
    ln_q, notes = ln_quotient(reaction, known)
    low, high = reaction.data_range
    if not low <= T <= high:
        outside = ", ".join(sp.key for sp in reaction.species if not sp.T_min <= T <= sp.T_max)
        notes = (*notes, f"data carried beyond their temperature range: {outside}")
    return Figures(
        reaction=reaction,
        T=T,
        p=p,
        extent=extent,
        ln_k=reaction.ln_k(T),
        ln_q=ln_q,
        dh=reaction.dh(T),
        ds=reaction.ds(T),
        dg=reaction.dg(T),
        dcp=reaction.dcp(T),
        dh298=reaction.dh(T_STANDARD),
        ds298=reaction.ds(T_STANDARD),
        dg298=reaction.dg(T_STANDARD),
        approach=equilibrium_temperature(reaction, ln_q, T, reason="; ".join(notes)),
        notes=notes,
    )


def fed_species(end: EndState, feed: Mapping[Species | str, float]) -> dict[Species, float]:
    """The feed by species; a string is the key of a candidate."""
    by_key = {sp.key: sp for sp in end.species}
    fed: dict[Species, float] = {}
    for item, amount in feed.items():
        if isinstance(item, str):
            if item not in by_key:
                raise InputError(
                    f"The feed holds {item}, which is not the key of a candidate; "
                    "give the feed that the end state was computed from.",
                    f"feed[{item}]",
                    item,
                    "a candidate's key or a Species",
                )
            item = by_key[item]
        fed[item] = fed.get(item, 0.0) + checked_amount(item.key, amount)
    return fed


def _amount(sp: Species, amount: float) -> float:
    try:
        return checked_amount(sp.key, amount)
    except InputError as error:
        raise InputError(str(error), f"amounts[{sp.key}]", amount, error.allowed) from None
