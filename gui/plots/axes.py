"""Axes of the composition plot: shares in linear or decade steps, printed as in the tables."""

from __future__ import annotations

import math

import pyqtgraph as pg

from solver.project.wording import number_text

FLOOR = -6
"""Lowest decade of mol % in the logarithmic view."""


class ShareAxis(pg.AxisItem):
    """mol % upwards; in the logarithmic view the plot's y is the power of ten."""

    def __init__(self) -> None:
        super().__init__("left")
        self.decades = False

    def tickValues(self, minVal: float, maxVal: float, size: float):  # type: ignore[no-untyped-def]
        """Whole decades in the logarithmic view."""
        if not self.decades:
            return few(super().tickValues(minVal, maxVal, size))
        low, high = math.ceil(minVal - 1e-9), min(math.floor(maxVal + 1e-9), 2)
        step = max(1, math.ceil((high - low) * 24 / max(size, 1)))
        return [(float(step), [float(v) for v in range(high, low - 1, -step)])]

    def tickStrings(self, values: list[float], scale: float, spacing: float) -> list[str]:
        """Numbers without padding."""
        if self.decades:
            return [decade_text(round(v)) for v in values]
        return [f"{v:g}".replace("-", "−") if v <= 100 else "" for v in values]


class PlainAxis(pg.AxisItem):
    """Whole numbers, never with a power of ten factored out, and few grid lines."""

    def tickValues(self, minVal: float, maxVal: float, size: float):  # type: ignore[no-untyped-def]
        """The coarsest ticks that are at least four, so that the grid stays light."""
        return few(super().tickValues(minVal, maxVal, size))

    def tickStrings(self, values: list[float], scale: float, spacing: float) -> list[str]:
        """Numbers without padding."""
        return [f"{v:g}".replace("-", "−") for v in values]


def few(levels, least: int = 4):  # type: ignore[no-untyped-def]
    """The coarsest levels of ticks that together are `least` or more, as one level."""
    ticks: list[float] = []
    for spacing, values in levels:
        ticks += list(values)
        if len(ticks) >= least:
            return [(spacing, sorted(ticks))]
    return levels


def decade_text(power: int) -> str:
    """10 to the power, in mol %: 100, 1, 0.01, then powers of ten."""
    if -3 < power <= 2:
        return f"{10.0**power:g}"
    return number_text(10.0**power, 1).replace("1 × ", "")
