"""Which species may be present at the end: the rules behind the list, additions, exclusions."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Final

import numpy as np

from solver.errors import InputError
from solver.project.model import Candidates
from species_db import ATOMIC_MASS, UnknownSpecies, load

if TYPE_CHECKING:
    from species_db import Library, Species

SHORT_RULE: Final = (
    "Gases without carbon; gases with one or two carbon atoms and at most three atoms besides "
    "hydrogen and halogens; graphite and every other liquid or solid that is no organic compound. "
    "Of isomers and of solid forms the most stable only; wustite as Fe0.947O, not as FeO; no ions, "
    "no explosives. Species fed are allowed too."
)
"""The short list in words an engineer can check."""

ALL_RULE: Final = "Every neutral species of the library that is made of the elements."
LISTED_RULE: Final = "The species added by hand and no other."
RULES: Final = {"short": SHORT_RULE, "all": ALL_RULE, "listed": LISTED_RULE}

_HALOGENS: Final = frozenset({"F", "Cl", "Br", "I", "At"})
_NON_METALS: Final = _HALOGENS | {"H", "D", "C", "N", "O", "S", "Se", "P"}
_NON_METALS_INERT: Final = frozenset({"He", "Ne", "Ar", "Kr", "Xe", "Rn"})
_EXPLOSIVE: Final = (
    {"N": 2, "H": 4, "O": 3},  # ammonium nitrate
    {"N": 1, "H": 4, "Cl": 1, "O": 4},  # ammonium perchlorate
    {"N": 2, "H": 8, "Cr": 2, "O": 7},  # ammonium dichromate
)
_SUPERSEDED: Final = {
    # Stoichiometric FeO does not exist at these pressures. Its tabulated Gibbs energy gives
    # p(H2O)/p(H2) over iron at half of what Emmett and Shultz measured (J. Am. Chem. Soc. 52
    # (1930) 4268), Fe0.947O agrees with them.
    # The liquid is tied to FeO(s) and would come out as stable 500 K below its melting point.
    "FeO(s)": "Fe0.947O(s)",
    "FeO(l)": "Fe0.947O(s)",
}
_EXPLOSIVE_WORDS: Final = ("azide", "fulminate", "acetylide", "picrate")


def choose(
    wish: Candidates, fed: Sequence[Species], library: Library, field: str = "candidates"
) -> tuple[tuple[Species, ...], list[InputError]]:
    """The candidates of a case, and what is wrong with the wish.

    Parameters
    ----------
    wish
        Rule, elements, phases, additions and exclusions as typed.
    fed
        The species of the streams; each is a candidate too, unless it is excluded, is not of the
        elements and phases wished for, or the rule is "listed".
    field
        Path of `wish`, for the faults.

    Returns
    -------
    species
        Gases first, then liquids and solids, without repeats.
    faults
        Names that nothing answers to, elements that no candidate holds.
    """
    faults: list[InputError] = []
    present = {e for sp in fed for e in sp.elements}
    elements = present
    if wish.elements is not None:
        faults += [
            InputError(
                f"{e!r} is not the symbol of an element; write symbols such as C or Fe.",
                f"{field}.elements[{i}]",
                e,
                "symbols of elements",
            )
            for i, e in enumerate(wish.elements)
            if e not in ATOMIC_MASS
        ]
        elements = present & set(wish.elements)
    excluded = _resolve(wish.excluded, library, f"{field}.excluded", faults)
    added = _resolve(wish.added, library, f"{field}.added", faults)
    chosen: list[Species] = []
    if wish.rule != "listed":
        chosen += _by_rule(wish.rule, frozenset(elements), wish.phases, library)
        chosen += [sp for sp in fed if sp.phase in wish.phases and elements >= set(sp.elements)]
    # An element that is not fed cannot appear; its species would only lengthen the list.
    chosen += [
        sp for sp in added if sp is not None and not sp.charge and present >= set(sp.elements)
    ]
    out = {sp.key for sp in excluded if sp is not None}
    unique = {sp.key: sp for sp in chosen if sp.key not in out}
    order = {"gas": 0, "liquid": 1, "solid": 2}
    species = tuple(sorted(unique.values(), key=lambda sp: order[sp.phase]))
    if not faults:
        faults += _unheld(wish, fed, species, field)
    return species, faults


def _by_rule(
    rule: str, elements: frozenset[str], phases: tuple[str, ...], library: Library
) -> tuple[Species, ...]:
    """The list that a rule gives; kept, because a case is read at every keystroke."""
    if library is not load():
        return _list(rule, elements, phases, library)
    key = (rule, elements, phases)
    if key not in _LISTS:
        if len(_LISTS) > 50:
            _LISTS.clear()
        _LISTS[key] = _list(rule, elements, phases, library)
    return _LISTS[key]


_LISTS: dict[tuple[str, frozenset[str], tuple[str, ...]], tuple[Species, ...]] = {}


def _list(
    rule: str, elements: frozenset[str], phases: tuple[str, ...], library: Library
) -> tuple[Species, ...]:
    made = library.made_of(elements, phases)
    return tuple(short_list(made) if rule == "short" else made)


def _unheld(
    wish: Candidates, fed: Sequence[Species], species: Sequence[Species], field: str
) -> list[InputError]:
    """A fault when fed elements occur in no candidate; one for all that have the same way out."""
    held = {e for sp in species for e in sp.elements}
    missing = sorted({e for sp in fed for e in sp.elements} - held)
    if not missing:
        return []
    symbols = ", ".join(missing)
    outside = wish.elements is not None and not set(missing) <= set(wish.elements)
    if wish.rule == "listed":
        where, way_out = "added", f"add a species with {missing[0]}"
    elif outside:
        where, way_out = "elements", f"add {symbols} to the elements"
    else:
        way_out = f"take back an exclusion, allow more phases, or add a species with {missing[0]}"
        where = "excluded" if wish.excluded else "phases"
    holders = ", ".join(
        dict.fromkeys(sp.key for sp in fed if any(e in sp.elements for e in missing))
    )
    return [
        InputError(
            f"No candidate holds {symbols}, which the feed holds (in {holders}); {way_out}.",
            f"{field}.{where}",
            symbols,
            f"candidates with {symbols}",
        )
    ]


def _resolve(
    texts: Iterable[str], library: Library, field: str, faults: list[InputError]
) -> list[Species | None]:
    found: list[Species | None] = []
    for i, text in enumerate(texts):
        try:
            found.append(library[text])
        except UnknownSpecies as error:
            faults.append(unknown_species(error, f"{field}[{i}]"))
            found.append(None)
    return found


def unknown_species(error: UnknownSpecies, field: str) -> InputError:
    """The library's complaint as a fault of a field, with the nearest keys."""
    near = ", ".join(error.near)
    said = error.reason or f"{error.text!r} is not in the library"
    hint = f"; did you mean {near}?" if near else "; write a key, a name or a formula."
    if error.reason and near:
        hint = f": {near}; write one of these."
    return InputError(f"{said}{hint}", field, error.text, near or "a key, a name or a formula")


def short_list(species: Iterable[Species]) -> list[Species]:
    """Those species of a list that `SHORT_RULE` keeps, in their order."""
    kept = [
        sp
        for sp in species
        if not sp.charge
        and not is_explosive(sp)
        and (_is_short_gas(sp) if sp.phase == "gas" else not is_organic(sp))
    ]
    forms: dict[tuple[object, ...], list[Species]] = {}
    for sp in kept:
        kind = "gas" if sp.phase == "gas" else "condensed"
        forms.setdefault((kind, *sorted(sp.elements.items())), []).append(sp)
    metastable = {sp.key for same in forms.values() for sp in _metastable(same)}
    keys = {sp.key for sp in kept}
    metastable |= {key for key, better in _SUPERSEDED.items() if better in keys}
    return [sp for sp in kept if sp.key not in metastable]


def _is_short_gas(sp: Species) -> bool:
    carbon = sp.elements.get("C", 0)
    heavy = sum(n for e, n in sp.elements.items() if e not in _HALOGENS and e not in ("H", "D"))
    return carbon == 0 or (carbon <= 2 and heavy <= 3)


def is_organic(sp: Species) -> bool:
    """Whether a liquid or solid counts as an organic compound.

    Carbon with hydrogen, but not the hydrogencarbonates of metals and of ammonium (at least three
    oxygen atoms for each carbon); carbon without hydrogen that is bound to nitrogen or a halogen
    alone (no metal, boron or silicon); and fullerenes. Graphite, the oxides and sulfides of
    carbon, carbonates, carbides, cyanides and carbonyls of metals are not organic.
    """
    carbon = sp.elements.get("C", 0)
    if not carbon:
        return False
    if set(sp.elements) == {"C"}:
        return carbon > 1  # molecular carbon, such as C60
    metal = any(e not in _NON_METALS and e not in _NON_METALS_INERT for e in sp.elements)
    if "H" in sp.elements or "D" in sp.elements:
        salt = metal or "ammonium" in sp.name.lower()
        return not (salt and sp.elements.get("O", 0) >= 3 * carbon)
    return not metal and any(e == "N" or e in _HALOGENS for e in sp.elements)


def is_explosive(sp: Species) -> bool:
    """Whether a liquid or solid is an explosive of the inorganic kind."""
    if sp.phase == "gas":
        return False
    name = sp.name.lower()
    return dict(sp.elements) in _EXPLOSIVE or any(word in name for word in _EXPLOSIVE_WORDS)


def _metastable(same: Sequence[Species]) -> list[Species]:
    """Of one composition, the gases or the solids that are nowhere the most stable.

    For gases (isomers) the comparison is at 298.15 K. For solids it runs over the temperatures
    where the data of the form and of another form or the liquid reach; a sole solid stays.
    """
    if same[0].phase == "gas":
        best = min(same, key=lambda sp: sp.g(298.15))
        return [sp for sp in same if sp is not best]
    solids = [sp for sp in same if sp.phase == "solid"]
    never = []
    for sp in solids if len(solids) > 1 else []:
        T = np.linspace(sp.T_min, sp.T_max, 25)
        others = np.min(
            [
                np.where((other.T_min <= T) & (other.T_max >= T), other.g(T), np.inf)
                for other in same
                if other is not sp
            ],
            axis=0,
        )
        known = np.isfinite(others)
        if known.any() and np.all(sp.g(T)[known] > others[known]):
            never.append(sp)
    return never
