"""Names of vertical rules in a strip above the plot, so that they never cross a curve."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import pyqtgraph as pg
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QPainter, QPen

MOST_ROWS = 4
_GAP = 6.0
_EVERY_WAY = 7
"""Flags up to which every choice of sides is tried."""


@dataclass(frozen=True, slots=True)
class Flag:
    """A rule's place (in the plot's own x), its words and their colour."""

    x: float
    words: str
    colour: QColor


@dataclass(frozen=True, slots=True)
class Placed:
    """A flag in pixels: place of its stem, left end of its words, and row from the plot up."""

    stem: float
    left: float
    row: int
    words: str
    colour: QColor


class Flags(pg.AxisItem):
    """Takes the place of the top axis; as high as its rows of words need."""

    def __init__(self) -> None:
        super().__init__("top")
        self._flags: list[Flag] = []
        self._font = QFont()
        self.setHeight(0)

    def set_flags(self, flags: list[Flag], font: QFont) -> None:
        """Show these; the strip takes the height that they need."""
        self._flags = sorted(flags, key=lambda f: f.x)
        self._font = QFont(font)
        self._fit()

    def placed(self) -> list[Placed]:
        """Where each flag stands; those that found no room are left out."""
        box, view = self._box(), self.linkedView()
        if view is None or not self._flags or box.width() <= 0:
            return []
        low, high = view.viewRange()[0]
        if high <= low:
            return []
        metrics = QFontMetricsF(self._font)
        inside = [f for f in self._flags if low <= f.x <= high]
        stems = [box.left() + (f.x - low) / (high - low) * box.width() for f in inside]
        widths = [metrics.horizontalAdvance(f.words) + _GAP for f in inside]
        places = arrange(stems, widths, box.left(), box.right())
        return [
            Placed(stem, left, row, f.words, f.colour)
            for f, stem, (left, row) in zip(inside, stems, places, strict=True)
            if row < MOST_ROWS
        ]

    def _row_height(self) -> float:
        return QFontMetricsF(self._font).height()

    def _fit(self) -> None:
        rows = max((p.row + 1 for p in self.placed()), default=0)
        height = round(rows * self._row_height()) + (3 if rows else 0)
        if height != round(self.height()):
            self.setHeight(height)
        self.update()

    def resizeEvent(self, ev=None) -> None:  # type: ignore[no-untyped-def]
        """Words may need other rows on another width."""
        super().resizeEvent(ev)
        if getattr(self, "_flags", None):
            self._fit()

    def _box(self) -> QRectF:
        return self.mapRectFromParent(self.geometry())

    def paint(self, p: QPainter, opt, widget) -> None:  # type: ignore[no-untyped-def]
        """Words, and a stem from each down to its rule."""
        box, height = self._box(), self._row_height()
        p.setRenderHint(QPainter.RenderHint.TextAntialiasing)
        p.setFont(self._font)
        for flag in self.placed():
            top = box.bottom() - (flag.row + 1) * height
            p.setPen(QPen(flag.colour, 0.7))
            p.drawLine(QPointF(flag.stem, top + 2), QPointF(flag.stem, box.bottom()))
            p.setPen(flag.colour)
            room = QRectF(flag.left + _GAP / 2, top, box.width(), height)
            p.drawText(
                room, int(Qt.AlignmentFlag.AlignVCenter | Qt.AlignmentFlag.AlignLeft), flag.words
            )


def arrange(
    stems: list[float], widths: list[float], low: float, high: float
) -> list[tuple[float, int]]:
    """Left end and row of each text, to one side of its stem, crossing no stem and no text.

    Stems (sorted, pixels) reach from the row of their text down to the plot (row 0 is the
    lowest). Of all choices of sides the one with the fewest rows is taken.
    """
    count = len(stems)
    if count <= _EVERY_WAY:
        ways = product((False, True), repeat=count)
    else:  # the first so many to the left, the others to the right
        ways = iter([tuple(i < k for i in range(count)) for k in range(count + 1)])
    best: tuple[tuple[int, int, int], list[tuple[float, int]]] | None = None
    for to_left in ways:
        lefts = [s - w if left else s for s, w, left in zip(stems, widths, to_left, strict=True)]
        outside = [a < low or a + w > high for a, w in zip(lefts, widths, strict=True)]
        rows = _rows(stems, lefts, widths)
        if rows is None:
            continue
        cost = (sum(outside), max(rows, default=0), sum(rows) + sum(to_left))
        if best is None or cost < best[0]:
            best = (cost, list(zip(lefts, rows, strict=True)))
    return best[1] if best else [(s, i) for i, s in enumerate(stems)]


def _rows(stems: list[float], lefts: list[float], widths: list[float]) -> list[int] | None:
    """The lowest rows in which no text meets another's stem or text; None where there are none."""
    count = len(stems)
    spans = [(a, a + w) for a, w in zip(lefts, widths, strict=True)]
    rows = [0] * count
    for _ in range(count * (count + 1)):
        moved = False
        for i in range(count):
            for j in range(count):
                if i == j:
                    continue
                over = spans[i][0] < stems[j] < spans[i][1]
                meet = spans[i][0] < spans[j][1] and spans[j][0] < spans[i][1]
                if over and rows[i] <= rows[j]:
                    rows[i], moved = rows[j] + 1, True
                elif meet and not over and i > j and rows[i] == rows[j]:
                    rows[i], moved = rows[i] + 1, True
        if not moved:
            return rows
        if max(rows) > count:
            return None
    return None
