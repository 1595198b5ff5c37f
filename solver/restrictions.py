"""What keeps a mixture short of full equilibrium.

Each restriction is a further row of the balances, or a shift of one species' g: the same
minimiser then finds the best state among those that obey it, with the same proof.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from solver.errors import InputError

if TYPE_CHECKING:
    from solver.reactions import Reaction


@dataclass(frozen=True, slots=True)
class Inert:
    """A fed species, or a part of it, that takes no part in any reaction.

    Without a part the whole species is inert: it is neither used up nor formed. With a
    part, that much of the feed passes through unchanged, as a diluent of the rest.

    Attributes
    ----------
    species : str
        Key of a candidate that is fed.
    share : float, optional
        The part as a share of what is fed, 0 to 1.
    amount : float, optional
        The part in mol.
    """

    species: str
    share: float | None = None
    amount: float | None = None

    def __post_init__(self) -> None:
        if self.share is not None and self.amount is not None:
            raise InputError(
                f"The inert part of {self.species} is given both as a share and as an amount; "
                "give one.",
                f"restrictions[{self.species}]",
                (self.share, self.amount),
                "a share or an amount",
            )
        _in_range(self.species, "inert share", self.share, 1.0, "")
        _in_range(self.species, "inert amount", self.amount, math.inf, " mol")

    @property
    def whole(self) -> bool:
        """Whether nothing of the species may react or form."""
        return self.amount is None and (self.share is None or self.share == 1.0)

    def __str__(self) -> str:
        if self.whole:
            return f"{self.species} inert"
        part = f"{self.amount:g} mol" if self.share is None else f"{100.0 * self.share:g} %"
        return f"{part} of the fed {self.species} inert"


@dataclass(frozen=True, slots=True)
class FixedConversion:
    """A fed species of which a given share is used up, no more and no less.

    Attributes
    ----------
    species : str
        Key of a candidate that is fed.
    conversion : float
        Share of what is fed that reacts, 0 to 1.
    """

    species: str
    conversion: float

    def __post_init__(self) -> None:
        _in_range(self.species, "conversion", self.conversion, 1.0, "")

    def __str__(self) -> str:
        return f"conversion of {self.species} held at {100.0 * self.conversion:g} %"


@dataclass(frozen=True, slots=True)
class HeldApproach:
    """A reaction whose equilibrium constant is taken at T + dT.

    The shift is carried by one species of the reaction, its key: every other reaction of
    that species moves with it, reactions without it stay at full equilibrium.

    Attributes
    ----------
    reaction : Reaction
    dT : float
        K. Negative for an endothermic reaction that stays behind, such as reforming.
    key : str, optional
        Key of the species that carries the shift; by default the first reactant that no
        other held reaction has.
    """

    reaction: Reaction
    dT: float
    key: str | None = None

    def __post_init__(self) -> None:
        if not math.isfinite(self.dT) or abs(self.dT) > 1000.0:
            raise InputError(
                f"The temperature approach of {self.reaction.text} is {self.dT} K; "
                "give -1000 to 1000 K.",
                "restrictions.approach",
                self.dT,
                "-1000 to 1000 K",
            )

    def __str__(self) -> str:
        sign = "-" if self.dT < 0.0 else "+"
        return f"{self.reaction.text} held at K(T {sign} {abs(self.dT):g} K)"


@dataclass(frozen=True, slots=True)
class NoExchange:
    """A group of species that exchanges no element with the others.

    The feed species in the group form only species of the group, and the rest only the rest;
    they still share temperature, pressure and the gas.

    Attributes
    ----------
    species : frozenset of str
        Keys of the group.
    """

    species: frozenset[str]

    def __init__(self, species: frozenset[str] | set[str] | list[str] | tuple[str, ...]) -> None:
        object.__setattr__(self, "species", frozenset(species))

    def __str__(self) -> str:
        return f"no exchange between {', '.join(sorted(self.species))} and the rest"


Restriction = Inert | FixedConversion | HeldApproach | NoExchange


@dataclass(frozen=True, slots=True)
class Cost:
    """What a restriction costs: how much lower the state would lie without it alone.

    Attributes
    ----------
    restriction : str
        In words.
    energy : float
        J; of Gibbs energy at the T and p reached, or of Helmholtz energy at the T and V, with
        the other restrictions built in (`solver.costs`); not below zero but for rounding.
    """

    restriction: str
    energy: float


def check_together(
    restrictions: tuple[Restriction, ...], fed: Mapping[str, float], keys: frozenset[str]
) -> None:
    """Refuse restrictions that contradict each other, the feed or the candidates.

    Parameters
    ----------
    fed : mapping of str to float
        mol of each species fed, by key.
    keys : frozenset of str
        Keys of the candidates.
    """
    limited: dict[str, Restriction] = {}
    grouped: dict[str, NoExchange] = {}
    for restriction in restrictions:
        if isinstance(restriction, Inert | FixedConversion):
            _check_limited(restriction, limited, fed, keys)
        elif isinstance(restriction, NoExchange):
            for key in sorted(restriction.species):
                if key not in keys:
                    raise _not_candidate(key, str(restriction))
                if key in grouped and grouped[key] != restriction:
                    raise InputError(
                        f"{key} is in two groups that do not exchange; leave it in one.",
                        f"restrictions[{key}]",
                        key,
                        "one group",
                    )
                grouped[key] = restriction
        else:
            for sp in restriction.reaction.numbers:
                if sp.key not in keys:
                    raise _not_candidate(sp.key, str(restriction))


def _check_limited(
    restriction: Inert | FixedConversion,
    limited: dict[str, Restriction],
    fed: Mapping[str, float],
    keys: frozenset[str],
) -> None:
    key = restriction.species
    if key not in keys:
        raise _not_candidate(key, str(restriction))
    if not fed.get(key, 0.0) > 0.0:
        raise InputError(
            f"{key} is restricted ({restriction}) but not fed; feed it or drop the restriction.",
            f"restrictions[{key}]",
            0.0,
            "a species that is fed",
        )
    if key in limited:
        raise InputError(
            f"{key} is restricted twice: {limited[key]}, and {restriction}; keep one.",
            f"restrictions[{key}]",
            str(restriction),
            "one restriction a species",
        )
    limited[key] = restriction
    part = restriction.amount if isinstance(restriction, Inert) else None
    if part is not None and part > fed[key] * (1.0 + 1e-12):
        raise InputError(
            f"{part:g} mol of {key} are to be inert, but only {fed[key]:g} mol are fed.",
            f"restrictions[{key}]",
            part,
            f"0 to {fed[key]:g} mol",
        )


def _not_candidate(key: str, what: str) -> InputError:
    return InputError(
        f"{key} ({what}) is no candidate; add it to the candidates or drop the restriction.",
        f"restrictions[{key}]",
        key,
        "a candidate's key",
    )


def _in_range(species: str, what: str, value: float | None, top: float, unit: str) -> None:
    if value is not None and not 0.0 <= value <= top:
        allowed = f"0 to 1{unit}" if top == 1.0 else f"0{unit} or more"
        raise InputError(
            f"The {what} of {species} is {value:g}{unit}; give {allowed}.",
            f"restrictions[{species}]",
            value,
            allowed,
        )
