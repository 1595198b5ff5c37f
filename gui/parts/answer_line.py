"""The answer in one row of large figures: T, p, V, heat, proof."""

from __future__ import annotations

from dataclasses import dataclass

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QHBoxLayout, QLabel, QVBoxLayout, QWidget

from gui import readings
from gui.parts.card import Label
from gui.theme import GRID
from solver.project.model import Case
from solver.project.units import from_si
from solver.project.wording import number_text, quantity_text, unit_text


@dataclass(frozen=True, slots=True)
class Figure:
    """What one place of the row shows."""

    title: str
    value: str
    unit: str
    beneath: str
    hint: str


class AnswerFigure(QWidget):
    """A small title, a large figure with its unit, and a small remark."""

    def __init__(self, title: str) -> None:
        super().__init__()
        self.title = Label(title, "muted", "small")
        self.value = Label("–", "", "figure")
        self.unit = Label("", "muted", "small")
        self.beneath = Label("", "muted", "small")
        self.value.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self.value.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        line = QHBoxLayout()
        line.setSpacing(3)
        line.addWidget(self.value, 0, Qt.AlignmentFlag.AlignBaseline)
        line.addWidget(self.unit, 0, Qt.AlignmentFlag.AlignBaseline)
        line.addStretch(1)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.title)
        column.addLayout(line)
        column.addWidget(self.beneath)

    def show(self, figure: Figure | None = None) -> None:
        """Show a figure; without one, just be visible."""
        super().show()
        if figure is None:
            return
        self.title.setText(figure.title)
        self.value.setText(figure.value)
        self.unit.setText(figure.unit)
        self.beneath.setText(figure.beneath)
        self.setToolTip(figure.hint)
        self.setAccessibleName(f"{figure.title} {figure.value} {figure.unit}")

    def set_stale(self, stale: bool) -> None:
        """Grey out."""
        for label in (self.value, self.unit, self.beneath):
            label.set_stale(stale)

    def parts(self) -> list[QLabel]:
        """The labels, for tests of what is seen."""
        return [self.title, self.value, self.unit, self.beneath]


class AnswerLine(QWidget):
    """Five figures in a row."""

    TITLES = ("temperature", "pressure", "volume", "heat added", "proof")

    def __init__(self) -> None:
        super().__init__()
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(GRID * 2)
        self.figures = {title: AnswerFigure(title) for title in self.TITLES}
        for figure in self.figures.values():
            row.addWidget(figure, 1)

    def show_answer(self, case: Case, answer, units: readings.Units) -> None:  # type: ignore[no-untyped-def]
        """Show a settled case."""
        for figure, shown in zip(self.figures.values(), figures(case, answer, units), strict=True):
            figure.show(shown)

    def clear(self) -> None:
        """Show no figures."""
        for title, figure in self.figures.items():
            figure.show(Figure(title, "–", "", "", ""))

    def set_stale(self, stale: bool) -> None:
        """Grey out."""
        for figure in self.figures.values():
            figure.set_stale(stale)


def figures(case: Case, answer, units: readings.Units) -> list[Figure]:  # type: ignore[no-untyped-def]
    """The five figures of an answer."""
    end, fed, flow = answer.end, answer.fed, answer.basis == "flow"
    pair = case.fixed.pair.split(",")

    def held(variable: str) -> str:
        if variable not in pair:
            return ""
        return "held" if variable in case.fixed.values else "held as fed"

    T = from_si(end.T, units.T, "temperature")
    other = "K" if units.T != "K" else "degC"
    T_other = quantity_text(from_si(end.T, other, "temperature"), other)
    p = from_si(end.p, units.p, "pressure")
    gauge = quantity_text(from_si(end.p, "barg", "pressure"), "barg")
    V, V_unit = readings.volume(end.V, flow)
    ratio = "" if fed.V <= 0 else f"{number_text(end.V / fed.V, 3)} × as fed"
    size = max(abs(answer.heat), 1e-9 * max(abs(end.H), abs(fed.H)))
    heat = answer.heat if abs(answer.heat) >= size else 0.0
    Q, Q_unit = readings.energy(heat, flow)
    kind = getattr(answer, "heat_is", "heat")
    law = "needed to hold it" if pair[0] in "TS" else "held"
    if heat == 0.0 and law == "held":
        law = "adiabatic"
    if kind == "work":
        law = "reversible"
    what = {"heat": "heat added", "work": "work put in"}.get(kind, "heat and work")
    if flow:
        what = {"heat": "heat flow added", "work": "power put in"}.get(kind, "heat and work")
    given = "given off" if kind == "heat" else "gained"
    gap, rigorous = end.proof.gap, end.proof.rigorous
    return [
        Figure(
            "temperature",
            number_text(T),
            unit_text(units.T),
            held("T") or T_other,
            f"{end.T!r} K, {T_other}",
        ),
        Figure(
            "pressure",
            number_text(p),
            unit_text(units.p),
            held("p") or gauge,
            f"{end.p!r} Pa absolute, {gauge}",
        ),
        Figure(
            "volume flow" if flow else "volume",
            number_text(V),
            unit_text(V_unit),
            held("V") or ratio,
            f"{end.V!r} m³{'/s' if flow else ''}",
        ),
        Figure(
            what,
            number_text(Q),
            Q_unit,
            law,
            f"{answer.heat!r} {'W' if flow else 'J'}, negative when {given}",
        ),
        Figure(
            "proof: gap to the minimum" if rigorous else "proof: gap, no bound",
            gap_text(gap),
            "nRT",
            ("proven to rounding" if rigorous else "no better state found")
            if abs(gap) < 1e-9
            else "see Proof",
            f"{gap!r}: no mixture of the candidates has a Gibbs energy lower by more than this"
            if rigorous
            else f"{gap!r}; no better state was found from {end.proof.starts} starts, which is no "
            "rigorous bound",
        ),
    ]


def gap_text(gap: float) -> str:
    """The gap to two digits; what lies below rounding is said as a bound."""
    size = abs(gap)
    return "< 10⁻¹⁵" if size < 1e-15 else number_text(size, 2)
