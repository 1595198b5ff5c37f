"""What a species is called within one case: the library's names, read with its candidates."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from species_db import Library, Species

FAR_BELOW: Final = 1e5
"""J/mol at 298.15 K from which a condensed form is what an engineer means by a bare formula."""


class CaseNames(Mapping[str, "Species"]):
    """Texts to species: as the library has it, but a bare formula means the candidate it fits.

    ``SiO2`` is quartz where quartz is the only candidate of that composition. `remarks` gathers
    bare formulas that were taken for a gas although a far more stable liquid or solid of the same
    composition is a candidate too (``C`` beside graphite, ``CaO`` beside lime).
    """

    def __init__(self, candidates: Sequence[Species], library: Library) -> None:
        self._library = library
        self.candidates = tuple(candidates)
        self._keys = {sp.key for sp in candidates}
        self.remarks: list[str] = []

    def __getitem__(self, text: str) -> Species:
        found = self._library[text]
        bare = not text.rstrip().endswith(")")
        if found.key not in self._keys and bare:
            same = self._like(found)
            return same[0] if len(same) == 1 else found
        if bare and found.phase == "gas":
            self._remark(found)
        return found

    def __iter__(self) -> Iterator[str]:
        return iter(self._library)

    def __len__(self) -> int:
        return len(self._library)

    def _like(self, wanted: Species) -> list[Species]:
        composition = dict(wanted.elements)
        return [
            sp
            for sp in self.candidates
            if sp.charge == wanted.charge and dict(sp.elements) == composition
        ]

    def _remark(self, gas: Species) -> None:
        condensed = [sp for sp in self._like(gas) if sp.phase != "gas"]
        best = min(condensed, key=lambda sp: sp.g(298.15), default=None)
        if best is not None and best.g(298.15) < gas.g(298.15) - FAR_BELOW:
            text = f"{gas.key} is read as the gas; for the {best.phase} write {best.key}."
            if text not in self.remarks:
                self.remarks.append(text)
