"""The library: look-up by key, formula, name or synonym; lists by elements; near misses."""

import functools
import re
from collections.abc import Iterable, Iterator, Mapping

from species_db.errors import UnknownSpecies
from species_db.formula import Composition, parse_formula, split_state
from species_db.loader import Entry, build_species, read_entries
from species_db.search import closest, folded, rank
from species_db.species import Species
from species_db.trade_names import TRADE_NAMES

_PHASES = ("gas", "liquid", "solid")
_SUFFIX = re.compile(r"^(?P<head>[^()]*(?:\([^()]*\)\d*[^()]*)*?)\((?P<form>[^()]+)\)$")
Identity = tuple[Composition, int, str]


@functools.cache
def load() -> "Library":
    """Return the built-in library; the same object each time."""
    return Library(read_entries())


class Library(Mapping[str, Species]):
    """Species by key. ``lib[text]`` also takes formulas, names and synonyms.

    A formula without a state of aggregation means the gas where the library has it, else the
    liquid, else the solid. A name alone means the reference state of an element, else the gas,
    else (no vapour to speak of at 298 K) the condensed record. Letters of a formula are
    case-sensitive (CO is not Co), names are not.
    """

    def __init__(
        self, entries: Mapping[str, Entry], own: Mapping[str, Species] | None = None
    ) -> None:
        self._entries = entries
        self._own: dict[str, Species] = dict(own or {})
        self._built: dict[str, Species] = {}

    # -- mapping -----------------------------------------------------------------------------
    def __getitem__(self, text: str) -> Species:
        key = self.resolve(text)
        if key in self._own:
            return self._own[key]
        found = self._built.get(key)
        if found is None:
            found = self._built[key] = build_species(self._entries[key])
        return found

    def __contains__(self, text: object) -> bool:
        if not isinstance(text, str):
            return False
        try:
            self.resolve(text)
        except UnknownSpecies:
            return False
        return True

    def __iter__(self) -> Iterator[str]:
        yield from self._own
        yield from (key for key in self._entries if key not in self._own)

    def __len__(self) -> int:
        return len(self._entries.keys() | self._own.keys())

    def __repr__(self) -> str:
        return f"<Library of {len(self)} species>"

    # -- look-up -----------------------------------------------------------------------------
    def resolve(self, text: str) -> str:
        """Key that a text stands for.

        Raises
        ------
        UnknownSpecies
            With the keys that come closest, or all isomers where a formula means several.
        """
        if text in self._own or text in self._entries:
            return text
        asked = text.strip()
        if asked in self._own or asked in self._entries:
            return asked
        for find in (self._by_trade_name, self._by_synonym, self._by_formula, self._by_name):
            key = find(asked)
            if key is not None:
                return key
        raise UnknownSpecies(text, closest(asked, self._names, self))

    def find(self, text: str, limit: int = 20) -> list[Species]:
        """Species whose key, name or synonym answers to a text, the likeliest first."""
        meant = self._by_trade_name(text.strip())
        keys = [*([meant] if meant else []), *self._all_named(text)]
        composition = self._identities(text)
        keys += [k for identity in composition for k in self._by_identity.get(identity, ())]
        keys += rank(text, self._rows())
        return [self[key] for key in dict.fromkeys(keys)][:limit]

    def made_of(
        self,
        elements: Iterable[str],
        phases: Iterable[str] = _PHASES,
        ions: bool = False,
    ) -> list[Species]:
        """Species that hold no other elements than these.

        Parameters
        ----------
        elements : iterable of str
            Symbols, for example ``{"C", "H", "O", "N"}``.
        phases : iterable of str
            Any of 'gas', 'liquid', 'solid'.
        ions : bool
            Charged species too, the electron among them.

        Returns
        -------
        list of Species
            Gases first, then liquids, then solids, each from few atoms to many.
        """
        allowed = frozenset(elements)
        wanted = [phases] if isinstance(phases, str) else list(phases)
        unknown = [p for p in wanted if p not in _PHASES]
        if unknown:
            raise ValueError(f"phase {unknown[0]!r} is not one of {', '.join(_PHASES)}")
        keys = [
            key
            for key, (symbols, charge, phase) in self._made_of_index.items()
            if symbols <= allowed and phase in wanted and (ions or not charge)
        ]
        found = [self[key] for key in keys]
        found.sort(key=lambda sp: (_PHASES.index(sp.phase), sum(sp.elements.values()), sp.key))
        return found

    def with_species(self, species: Iterable[Species]) -> "Library":
        """A new library with the user's own species layered over this one (same key: replaced)."""
        return Library(self._entries, {**self._own, **{sp.key: sp for sp in species}})

    # -- indexes, made when first needed -------------------------------------------------------
    def _rows(self) -> Iterator[Entry]:
        for sp in self._own.values():
            counts = " ".join(f"{e}:{n:g}" for e, n in sp.elements.items())
            synonyms = "|".join(sp.synonyms)
            yield Entry(
                sp.key, sp.name, counts, str(sp.charge), sp.phase, False, True, synonyms, ""
            )
        yield from (e for key, e in self._entries.items() if key not in self._own)

    @functools.cached_property
    def _made_of_index(self) -> dict[str, tuple[frozenset[str], int, str]]:
        return {
            row.key: (frozenset(row.composition()), int(row.charge), row.phase)
            for row in self._rows()
        }

    @functools.cached_property
    def _by_identity(self) -> dict[Identity, list[str]]:
        """Keys of each composition, charge and phase, the usual one first."""
        index: dict[Identity, list[str]] = {}
        for row in self._rows():
            composition = tuple(sorted(row.composition().items()))
            same = index.setdefault((composition, int(row.charge), row.phase), [])
            same.insert(0 if row.usual else len(same), row.key)
        return index

    @functools.cached_property
    def _synonyms(self) -> dict[str, str]:
        """Synonyms as written (other spellings of a key) -> key."""
        return {s: row.key for row in self._rows() for s in row.synonyms.split("|") if s}

    @functools.cached_property
    def _names(self) -> dict[str, list[str]]:
        """Names and synonyms, letters folded -> keys, the record that the name means first."""
        rows = sorted(
            self._rows(),
            key=lambda r: (r.charge != "0", not r.named, _PHASES.index(r.phase), not r.usual),
        )
        index: dict[str, list[str]] = {}
        for row in rows:
            index.setdefault(folded(row.name), []).append(row.key)
        for row in rows:  # a name of one record goes before a synonym of another
            for synonym in row.synonyms.split("|"):
                if synonym and row.key not in (same := index.setdefault(folded(synonym), [])):
                    same.append(row.key)
        return index

    def _by_trade_name(self, text: str) -> str | None:
        """A name that means one form of a substance."""
        key = TRADE_NAMES.get(folded(text))
        return key if key in self._entries else None

    def _by_synonym(self, text: str) -> str | None:
        """Another spelling of a key, letter for letter; a name shared by phases is left alone."""
        key = self._synonyms.get(text)
        return key if key and len(self._names.get(folded(text), ())) == 1 else None

    def _identities(self, text: str) -> list[Identity]:
        """Composition, charge and phases that a formula may mean; empty if it is none."""
        head, state = split_state(text)
        parsed = parse_formula(head)
        if parsed is None:
            return []
        composition, charge = parsed
        if charge and text in ("e-", "E-"):
            return []
        return [(composition, charge, phase) for phase in ((state,) if state else _PHASES)]

    def _by_formula(self, text: str) -> str | None:
        for identity in self._identities(text):
            keys = self._by_identity.get(identity, [])
            if len(keys) == 1 or (keys and self._is_usual(keys[0])):
                return keys[0]
            if keys:
                raise UnknownSpecies(text, tuple(keys), f"{text!r} may mean several isomers")
        return None

    def _is_usual(self, key: str) -> bool:
        entry = self._entries.get(key)
        return bool(entry and entry.usual)

    def _all_named(self, text: str) -> list[str]:
        return self._names.get(folded(text), [])

    def _by_name(self, text: str) -> str | None:
        keys = self._all_named(text)
        if keys:
            return keys[0]
        head, state = split_state(text)
        if state:
            return next((k for k in self._all_named(head) if self._phase(k) == state), None)
        return self._by_form(text)

    def _by_form(self, text: str) -> str | None:
        """``C4H10(2-methylpropane)``, ``C4H10(isobutane,l)``: a formula and a name for it."""
        found = _SUFFIX.match(text)
        if not found:
            return None
        parsed = parse_formula(found["head"])
        form, _, letter = found["form"].rpartition(",")
        if letter.strip() not in ("g", "l", "s"):
            form, letter = found["form"], ""
        if parsed is None:
            return None
        named = self._all_named(form)
        same = [
            key
            for phase in _PHASES
            for key in self._by_identity.get((*parsed, phase), ())
            if key in named and (not letter or phase[0] == letter.strip()[:1])
        ]
        return same[0] if same else None

    def _phase(self, key: str) -> str:
        return self._own[key].phase if key in self._own else self._entries[key].phase
