"""Axes of the composition plot: shares in linear or decade steps, printed as in the tables."""

from __future__ import annotations

import math

import pyqtgraph as pg
from PySide6.QtCore import QRectF

from solver.project.wording import number_text

FLOOR = -6
"""Lowest decade of mol % in the logarithmic view."""


class RoomyAxis(pg.AxisItem):
    """An axis that also writes the numbers at its very ends."""

    def boundingRect(self) -> QRectF:
        """Half a number beyond the ends."""
        return super().boundingRect().adjusted(-24, -10, 24, 10)


class ShareAxis(RoomyAxis):
    """mol % upwards; in the logarithmic view the plot's y is the power of ten."""

    def __init__(self) -> None:
        super().__init__("left")
        self.decades = False

    def tickValues(self, minVal: float, maxVal: float, size: float):  # type: ignore[no-untyped-def]
        """Whole decades in the logarithmic view."""
        if not self.decades:
            return round_ticks(minVal, maxVal, size / 34)
        low, high = math.ceil(minVal - 1e-9), min(math.floor(maxVal + 1e-9), 2)
        step = max(1, math.ceil((high - low) * 24 / max(size, 1)))
        return [(float(step), [float(v) for v in range(high, low - 1, -step)])]

    def tickStrings(self, values: list[float], scale: float, spacing: float) -> list[str]:
        """Numbers without padding."""
        if self.decades:
            return [decade_text(round(v)) for v in values]
        return [
            text if v <= 100.01 else ""
            for v, text in zip(values, plain(values, spacing), strict=True)
        ]


class PlainAxis(RoomyAxis):
    """Whole numbers, never with a power of ten factored out, and few grid lines."""

    def tickValues(self, minVal: float, maxVal: float, size: float):  # type: ignore[no-untyped-def]
        """Round numbers, the ends of the range among them where they are round."""
        return round_ticks(minVal, maxVal, size / 90)

    def tickStrings(self, values: list[float], scale: float, spacing: float) -> list[str]:
        """Numbers without padding."""
        return plain(values, spacing)


def round_ticks(low: float, high: float, most: float) -> list[tuple[float, list[float]]]:
    """Multiples of 1, 2 or 5 times a power of ten within a range, about `most` of them or fewer.

    The ends count as inside although a change of unit has left them a rounding off.
    """
    span = high - low
    if not span > 0.0:
        return []
    least = span / max(most, 2.0)
    power = 10.0 ** math.floor(math.log10(least))
    step = next(m * power for m in (1.0, 2.0, 5.0, 10.0) if m * power >= least * (1.0 - 1e-9))
    slack = 1e-6
    first, last = math.ceil(low / step - slack), math.floor(high / step + slack)
    inset = 1e-7 * span  # or the axis takes a tick at its very end for one outside
    ticks = [min(max(k * step, low + inset), high - inset) for k in range(first, last + 1)]
    return [(step, ticks)]


def plain(values: list[float], spacing: float) -> list[str]:
    """Ticks as numbers, without the rounding that came with a change of unit."""
    texts = [f"{round(v / spacing, 4) * spacing:g}".replace("-", "−") for v in values]
    return ["0" if text == "−0" else text for text in texts]


def decade_text(power: int) -> str:
    """10 to the power, in mol %: 100, 1, 0.01, then powers of ten."""
    if -3 < power <= 2:
        return f"{10.0**power:g}"
    return number_text(10.0**power, 1).replace("1 × ", "")
