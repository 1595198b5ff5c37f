"""One colour per species, everywhere.

The colours are Paul Tol's qualitative sets "bright" (without its grey) and "muted", made to be
told apart by colour-blind readers (P. Tol, Colour schemes, SRON technical note, from memory).
"""

from __future__ import annotations

from zlib import crc32

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor

from gui.theme import Tokens, readable

# Those of "muted" that lie close to one of "bright" come last, where curves are dashed.
PALETTE = (
    "#4477AA",
    "#66CCEE",
    "#EE6677",
    "#228833",
    "#CCBB44",
    "#AA3377",
    "#332288",
    "#44AA99",
    "#999933",
    "#88CCEE",
    "#117733",
    "#DDCC77",
    "#CC6677",
    "#882255",
    "#AA4499",
)
# The species most cases show have a fixed seat, so that they look the same in every project.
_SEATS = {"H2": 0, "H2O": 1, "CO": 2, "CO2": 3, "CH4": 4, "N2": 5, "O2": 7, "C(gr)": 6}
_DASHES = (Qt.PenStyle.SolidLine, Qt.PenStyle.DashLine, Qt.PenStyle.DotLine)
DIRECT = 9
"""Seats that are drawn solid; later ones carry a dash pattern as a second sign."""


class SpeciesColours:
    """Hands out seats in the palette; a key keeps its seat as long as the project is open."""

    def __init__(self) -> None:
        self._seats: dict[str, int] = {}

    def clear(self) -> None:
        """Forget all seats (another project was opened)."""
        self._seats.clear()

    def seat(self, key: str) -> int:
        """The seat of `key`: where its name falls, or the next free one."""
        if key in self._seats:
            return self._seats[key]
        if key in _SEATS:
            self._seats[key] = _SEATS[key]
            return _SEATS[key]
        taken = set(self._seats.values()) | set(_SEATS.values())
        count = len(PALETTE) * len(_DASHES)
        start = crc32(key.encode()) % len(PALETTE)
        seat = next((s for s in _order(start) if s not in taken), start % count)
        self._seats[key] = seat
        return seat

    def base(self, key: str) -> str:
        """The palette colour of `key`."""
        return PALETTE[self.seat(key) % len(PALETTE)]

    def fill(self, key: str, tokens: Tokens) -> QColor:
        """The colour of bars and curves, kept apart from the panel."""
        return readable(self.base(key), tokens, 2.2 if tokens.dark else 1.7)

    def label(self, key: str, tokens: Tokens) -> QColor:
        """The colour of text about `key`."""
        return readable(self.base(key), tokens)

    def dash(self, key: str) -> Qt.PenStyle:
        """The dash pattern of a curve."""
        seat = self.seat(key)
        if seat < DIRECT:
            return Qt.PenStyle.SolidLine
        return _DASHES[1 + (seat // len(PALETTE)) % 2]


def _order(start: int) -> list[int]:
    seats = len(PALETTE)
    first = [(start + i) % seats for i in range(seats)]
    return [lap * seats + s for lap in range(len(_DASHES)) for s in first]
