"""Composition against temperature: one colour per species, named at the curve's end."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import QPointF, Qt, Signal
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QKeyEvent, QPen
from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from gui.colours import SpeciesColours
from gui.line import Line, phase_changes, shown_keys
from gui.plots.axes import FLOOR, PlainAxis, ShareAxis
from gui.plots.end_labels import EndLabels
from gui.plots.flags import Flag, Flags
from gui.theme import Theme, mixed, sized
from solver.project.units import from_si
from solver.project.wording import formula_text, number_text, unit_text


@dataclass(frozen=True, slots=True)
class Mark:
    """The current case: its temperature in K and its shares by key."""

    T: float
    shares: dict[str, float]


class CompositionPlot(QWidget):
    """Draws a `Line`; the mouse or the arrow keys read it out."""

    read_out = Signal(str)

    def __init__(self, theme: Theme, colours: SpeciesColours) -> None:
        super().__init__()
        self._theme = theme
        self._colours = colours
        self._line: Line | None = None
        self._mark: Mark | None = None
        self._unit = "degC"
        self._empty = (500.0, 1500.0)
        self._log = False
        self._stale = False
        self._keys: list[str] = []
        self._cursor: float | None = None
        self.axis = ShareAxis()
        self.labels = EndLabels()
        self.bottom = PlainAxis("bottom")
        self.flags = Flags()
        self.view = pg.PlotWidget(
            axisItems={
                "left": self.axis,
                "right": self.labels,
                "bottom": self.bottom,
                "top": self.flags,
            }
        )
        self.view.setAccessibleName("composition against temperature")
        self.view.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        item = self.view.getPlotItem()
        item.showAxis("right")
        item.showAxis("top")
        item.setMenuEnabled(False)
        item.hideButtons()
        item.getViewBox().setMouseEnabled(x=True, y=True)
        item.getViewBox().setDefaultPadding(0.0)
        self.view.setFrameShape(self.view.Shape.NoFrame)
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.addWidget(self.view)
        self.note = QLabel(self.view)
        self.note.setTextFormat(Qt.TextFormat.RichText)
        self.note.setAttribute(Qt.WidgetAttribute.WA_TransparentForMouseEvents)
        self.note.hide()
        self._rule = pg.InfiniteLine(angle=90)
        self._rule.hide()
        self.view.scene().sigMouseMoved.connect(self._mouse)
        self.view.scene().sigMouseClicked.connect(self._click)
        self.view.keyPressEvent = self._key  # type: ignore[method-assign]
        self.view.leaveEvent = lambda event: self._read(None)  # type: ignore[method-assign]
        theme.changed.connect(self.draw)
        self.draw()

    # -- what is shown

    def show_line(self, line: Line | None, unit: str, mark: Mark | None = None) -> None:
        """Draw a line against temperature in `unit` and the current case on it.

        Without a line the plot is empty. What is drawn already is not drawn again.
        """
        wanted = (line, unit, mark, False)
        drawn = (self._line, self._unit, self._mark, self._stale)
        if line is not None and line is self._line and wanted[1:] == drawn[1:]:
            return
        self._line, self._unit, self._mark, self._stale = wanted
        self.draw()

    def set_empty_range(self, low: float, high: float) -> None:
        """The temperatures (K) between which an empty plot is drawn."""
        self._empty = (low, high)

    def set_stale(self, stale: bool) -> None:
        """Pale the curves: they belong to an earlier input."""
        if stale != self._stale:
            self._stale = stale
            self.draw()

    def set_logarithmic(self, on: bool) -> None:
        """Show decades of mol %."""
        if on != self._log:
            self._log = on
            self.draw()

    def curve_names(self) -> list[str]:
        """Labels at the curves' ends."""
        return [label[0] for label in self.labels.placed()]

    # -- drawing

    def draw(self) -> None:
        """Draw everything anew."""
        t = self._theme.tokens
        item = self.view.getPlotItem()
        item.clear()
        self.view.setBackground(QColor(t.panel))
        small = sized(self.font(), "small")
        for axis in (self.axis, self.bottom):
            axis.setPen(QPen(QColor(t.line), 1))
            axis.setTextPen(QPen(QColor(t.muted)))
            axis.setTickFont(small)
            axis.setStyle(tickLength=0, tickTextOffset=6, hideOverlappingLabels=False)
            axis.setGrid(70 if not t.dark else 110)
        style = {"color": t.muted, "font-size": f"{small.pointSizeF():.1f}pt"}
        self.bottom.setLabel(f"temperature, {unit_text(self._unit)}", **style)
        self.axis.setLabel(self._title(), **style)
        self.axis.decades = self._log
        self._keys = shown_keys(self._line, self._log) if self._line is not None else []
        if self._line is None:
            self.labels.set_labels([], small)
            self.flags.set_flags([], small)
            self._read(None)
            low, high = self._empty
            x = (float(self._x(low)), float(self._x(high)))
            item.getViewBox().setRange(xRange=x, yRange=(0, 105), padding=0)
            return
        self._draw_curves(item, small)
        flags = [*self._draw_changes(item), *self._draw_mark(item)]
        pen = QPen(QColor(t.muted), 1)
        pen.setCosmetic(True)
        self._rule = pg.InfiniteLine(angle=90, pen=pen)
        self._rule.hide()
        item.addItem(self._rule, ignoreBounds=True)
        self._set_range(item)
        self.flags.set_flags(flags, small)
        self._read(self._cursor)

    def _title(self) -> str:
        return "mol % of all phases" if self._any_condensed() else "mol % of the gas"

    def _any_condensed(self) -> bool:
        line = self._line
        if line is None:
            return False
        if any(present.any() for _, present in line.fluids):
            return True
        at = [line.keys.index(k) for k in line.condensed]
        return bool(np.nan_to_num(line.shares[:, at]).any()) if at else False

    def _y(self, shares: np.ndarray) -> np.ndarray:
        percent = 100.0 * np.asarray(shares, dtype=float)
        if not self._log:
            return percent
        with np.errstate(divide="ignore"):
            return np.log10(np.maximum(percent, 10.0 ** (FLOOR - 4)))

    def _x(self, T: np.ndarray | float) -> np.ndarray:
        return np.asarray(from_si(T, self._unit, "temperature"))  # type: ignore[arg-type]

    def _colour(self, key: str) -> QColor:
        colour = self._colours.fill(key, self._theme.tokens)
        return mixed(colour, self._theme.tokens.panel, 0.6) if self._stale else colour

    def _draw_curves(self, item: pg.PlotItem, font: QFont) -> None:
        line, labels = self._line, []
        assert line is not None
        x = self._x(line.T)
        bold = QFont(font)
        bold.setBold(True)
        for key in reversed(self._keys):
            shares = line.shares[:, line.keys.index(key)]
            if key in line.condensed:
                shares = _while_there(shares)
            y = self._y(shares)
            pen = QPen(self._colour(key), 2)
            pen.setCosmetic(True)
            pen.setStyle(self._colours.dash(key))
            item.plot(x, y, pen=pen, antialias=True, connect="finite")
            good = np.flatnonzero(np.isfinite(y))
            if not good.size:
                continue
            colour = self._colours.label(key, self._theme.tokens)
            if good[-1] == _last(line.shares):
                labels.append((formula_text(key), float(y[good[-1]]), colour))
            else:
                self._name_curve(item, bold, key, colour, y)
        self.labels.set_labels(labels, font)

    def _name_curve(
        self, item: pg.PlotItem, font: QFont, key: str, colour: QColor, y: np.ndarray
    ) -> None:
        """Name a phase that is gone before the end, beside its curve where there is most room."""
        line = self._line
        assert line is not None
        x, top = self._x(line.T), np.nanmax(y)
        others = np.stack(
            [self._y(line.shares[:, line.keys.index(k)]) for k in self._keys if k != key]
            or [np.full_like(y, np.nan)]
        )
        floor, ceiling = self._range()
        if top < floor + 0.04 * (ceiling - floor):
            return  # too low to tell; the strip above and the read-out name it
        above = np.nanmin(np.where(others >= y, others, ceiling), axis=0) - y
        below = y - np.nanmax(np.where(others < y, others, floor), axis=0)
        width = QFontMetricsF(font).horizontalAdvance(key) / max(self.view.width() - 180, 100)
        reach = max(round(width * len(y)), 1)
        above, below = _least_near(above, reach), _least_near(below, reach)
        near_top = np.isfinite(y) & (y >= floor + 0.85 * (top - floor))
        room = np.where(near_top, np.maximum(above, 0.8 * below), -np.inf)
        at = int(np.argmax(room))
        up = above[at] >= 0.8 * below[at]
        ground = QColor(self._theme.tokens.panel)
        ground.setAlpha(200)
        text = pg.TextItem(
            formula_text(key),
            color=colour,
            anchor=((x[at] - x[0]) / (x[-1] - x[0]), 1.0 if up else 0.0),
            fill=ground,
        )
        text.setFont(font)
        item.addItem(text, ignoreBounds=True)
        text.setPos(x[at], y[at])

    def _draw_changes(self, item: pg.PlotItem) -> list[Flag]:
        """Rules where phases come and go, named in the strip above."""
        t, flags = self._theme.tokens, []
        for T, words in phase_changes(self._line) if self._line else []:
            x = float(self._x(T))
            self._rule_at(item, x, t.line)
            flags.append(Flag(x, words, QColor(t.muted)))
        return flags

    def _rule_at(self, item: pg.PlotItem, x: float, colour: str) -> None:
        pen = QPen(QColor(colour), 1, Qt.PenStyle.DashLine)
        pen.setCosmetic(True)
        item.addItem(pg.InfiniteLine(x, angle=90, pen=pen), ignoreBounds=True)

    def _draw_mark(self, item: pg.PlotItem) -> list[Flag]:
        """The current case as dots on its rule."""
        line, mark, t = self._line, self._mark, self._theme.tokens
        if mark is None or line is None or not line.T[0] <= mark.T <= line.T[-1]:
            return []
        x = float(self._x(mark.T))
        self._rule_at(item, x, t.accent)
        spots = [
            {
                "pos": (x, float(self._y(np.array(mark.shares[key])))),
                "pen": pg.mkPen(self._colour(key), width=1.6),
                "brush": pg.mkBrush(t.panel),
                "size": 8,
            }
            for key in self._keys
            if key in mark.shares
        ]
        item.addItem(pg.ScatterPlotItem(spots, pxMode=True), ignoreBounds=True)
        return [Flag(x, "this case", QColor(t.accent))]

    def _range(self) -> tuple[float, float]:
        """The lowest and the highest y that the plot begins with."""
        line = self._line
        assert line is not None
        if self._log:
            return FLOOR + 2.0, 2.1
        at = [line.keys.index(k) for k in self._keys]
        top = float(np.nan_to_num(line.shares[:, at]).max()) * 100 if at else 1.0
        return 0.0, top * 1.05 if top > 0 else 1.0

    def _set_range(self, item: pg.PlotItem) -> None:
        assert self._line is not None
        x = self._x(self._line.T)
        item.getViewBox().setRange(xRange=(x[0], x[-1]), yRange=self._range(), padding=0)

    # -- reading out

    def _mouse(self, position: QPointF) -> None:
        box = self.view.getPlotItem().getViewBox()
        if self._line is None or not box.sceneBoundingRect().contains(position):
            self._read(None)
            return
        self._read(box.mapSceneToView(position).x())

    def _click(self, event) -> None:  # type: ignore[no-untyped-def]
        if event.double() and self._line is not None:
            self._set_range(self.view.getPlotItem())

    def _key(self, event: QKeyEvent) -> None:
        step = {Qt.Key.Key_Left: -1, Qt.Key.Key_Right: 1}.get(Qt.Key(event.key()))
        if step is None or self._line is None:
            pg.PlotWidget.keyPressEvent(self.view, event)
            return
        x = self._x(self._line.T)
        at = self._cursor if self._cursor is not None else float(x[0])
        nearest = int(np.abs(x - at).argmin())
        self._read(float(x[min(max(nearest + step, 0), len(x) - 1)]))

    def _read(self, x: float | None) -> None:
        """Show the composition at `x` (in the plot's unit), between points by interpolation."""
        self._cursor = x
        line = self._line
        grid = self._x(line.T) if line is not None else np.zeros(0)
        if x is None or line is None or not len(grid) or not grid[0] <= x <= grid[-1]:
            self._rule.hide()
            self.note.hide()
            self.read_out.emit("")
            return
        self._rule.setValue(x)
        self._rule.show()
        values = {
            key: float(np.interp(x, grid, line.shares[:, line.keys.index(key)]))
            for key in self._keys
        }
        order = sorted((k for k in values if np.isfinite(values[k])), key=lambda k: -values[k])
        head = f"{number_text(x)} {unit_text(self._unit)}"
        self.read_out.emit(
            head + ": " + ", ".join(f"{k} {number_text(100 * values[k], 3)} %" for k in order)
        )
        t = self._theme.tokens
        rows = "".join(
            f"<tr><td style='color:{self._colours.label(k, t).name()}'>{formula_text(k)}</td>"
            f"<td align='right'>&nbsp;&nbsp;{number_text(100 * values[k], 3)}</td></tr>"
            for k in order[:9]
        )
        self.note.setText(f"<b>{head}</b><table cellspacing=0>{rows}</table>")
        self.note.setFont(sized(self.font(), "small"))
        self.note.setStyleSheet(
            f"background:{t.panel}; color:{t.text}; border:1px solid {t.line}; padding:4px 6px;"
        )
        self.note.adjustSize()
        self._place_note(x)
        self.note.show()

    def _place_note(self, x: float) -> None:
        box = self.view.getPlotItem().getViewBox()
        corner = self.view.mapFromScene(box.mapViewToScene(QPointF(x, 0)))
        area = self.view.mapFromScene(box.sceneBoundingRect()).boundingRect()
        right = corner.x() + 12 + self.note.width() < area.right()
        left = corner.x() + 12 if right else corner.x() - 12 - self.note.width()
        self.note.move(int(left), area.top() + 6)


def _while_there(shares: np.ndarray) -> np.ndarray:
    """A condensed phase's share, NaN where there is none but for the points next to it."""
    there = shares > 0.0
    near = there.copy()
    near[1:] |= there[:-1]
    near[:-1] |= there[1:]
    return np.where(near, shares, np.nan)


def _least_near(values: np.ndarray, reach: int) -> np.ndarray:
    """The least within `reach` points to either side, NaN aside."""
    padded = np.pad(np.nan_to_num(values, nan=np.inf), reach, constant_values=np.inf)
    return np.lib.stride_tricks.sliding_window_view(padded, 2 * reach + 1).min(axis=1)


def _last(shares: np.ndarray) -> int:
    """The last point that was settled."""
    good = np.flatnonzero(np.isfinite(shares).any(axis=1))
    return int(good[-1]) if good.size else -1
