"""Labels at the right end of curves, moved apart where they would overlap."""

from __future__ import annotations

import pyqtgraph as pg
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QPainter, QPen


class EndLabels(pg.AxisItem):
    """Takes the place of the right axis and writes each curve's name beside its end."""

    def __init__(self, width: int = 92) -> None:
        super().__init__("right")
        self._labels: list[tuple[str, float, QColor]] = []
        self._font = QFont()
        self.setWidth(width)

    def set_labels(self, labels: list[tuple[str, float, QColor]], font: QFont) -> None:
        """(text, y in the plot's own coordinates, colour) of each curve."""
        self._labels = labels
        self._font = QFont(font)
        self._font.setBold(True)
        self.update()

    def placed(self) -> list[tuple[str, float, float, QColor]]:
        """(text, y of the curve's end, y of the label, colour) in pixels, from the top."""
        box = self._box()
        view = self.linkedView()
        if view is None or not self._labels:
            return []
        low, high = view.viewRange()[1]
        if high <= low:
            return []
        height = QFontMetricsF(self._font).height() * 0.92

        def pixel(y: float) -> float:
            return box.bottom() - (y - low) / (high - low) * box.height()

        inside = [(t, pixel(y), c) for t, y, c in self._labels if low - 1e-12 <= y <= high]
        inside.sort(key=lambda item: item[1])
        places = spread([y for _, y, _ in inside], height, box.top(), box.bottom())
        return [(t, y, at, c) for (t, y, c), at in zip(inside, places, strict=True)]

    def _box(self) -> QRectF:
        """The axis's own place; its bounding rectangle reaches beyond the plot."""
        return self.mapRectFromParent(self.geometry())

    def paint(self, p: QPainter, opt, widget) -> None:  # type: ignore[no-untyped-def]
        """Names and, where a name had to move, a hair line to its curve."""
        box = self._box()
        p.setRenderHint(QPainter.RenderHint.TextAntialiasing)
        p.setFont(self._font)
        metrics = QFontMetricsF(self._font)
        for text, y, at, colour in self.placed():
            if abs(at - y) > 2:
                p.setPen(QPen(colour, 0.7))
                p.drawLine(QPointF(box.left() + 1, y), QPointF(box.left() + 9, at))
            p.setPen(colour)
            room = QRectF(
                box.left() + 11, at - metrics.height() / 2, box.width() - 11, metrics.height()
            )
            p.drawText(
                room,
                int(Qt.AlignmentFlag.AlignVCenter | Qt.AlignmentFlag.AlignLeft),
                metrics.elidedText(text, Qt.TextElideMode.ElideRight, room.width()),
            )


def spread(wanted: list[float], gap: float, low: float, high: float) -> list[float]:
    """Sorted places moved apart to at least `gap`, kept within `low` and `high` if they fit.

    Groups of neighbours that touch are centred on the mean of what they wanted.
    """
    groups: list[list[float]] = []  # each: [sum of wishes, count]
    for y in wanted:
        groups.append([y, 1.0])
        while len(groups) > 1:
            (s1, n1), (s2, n2) = groups[-2], groups[-1]
            if s2 / n2 - s1 / n1 >= gap * (n1 + n2) / 2:
                break
            groups[-2:] = [[s1 + s2, n1 + n2]]
    out: list[float] = []
    for total, count in groups:
        start = total / count - gap * (count - 1) / 2
        out += [start + gap * i for i in range(int(count))]
    margin = gap / 2
    floor = low + margin
    for i, y in enumerate(out):
        out[i] = max(y, floor)
        floor = out[i] + gap
    ceiling = high - margin
    for i in range(len(out) - 1, -1, -1):
        out[i] = min(out[i], ceiling)
        ceiling = out[i] - gap
    return out
