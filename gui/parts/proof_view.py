"""The view "Proof": each figure with its limit, what is held back, and what is absent."""

from __future__ import annotations

from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import QScrollArea, QVBoxLayout, QWidget

from gui import readings
from gui.parts.answer_line import gap_text
from gui.parts.card import Sentence
from gui.parts.figures_view import FiguresTable
from gui.reaction_rows import formulas
from gui.tables import clipboard
from gui.tables.figures_model import Cell, Words
from gui.theme import GRID, ROW_HEIGHT, Theme
from solver.fixed import PAIRS
from solver.project.wording import formula_text, number_text, typeset

MEANING = {
    "element closure": "Largest difference between the atoms at the end and the atoms fed, over "
    "the largest total.",
    "trace closure": "The same for each element over its own total, so that traces count.",
    "energy closure": "Distance of the energy or entropy from the value held, over nRT.",
    "gap": "No mixture of the candidates lies lower in Gibbs energy by more than this, over nRT.",
}
OF_SEARCH = {
    "gap": "Distance of the Gibbs energy from the tangent plane, over nRT; no rigorous bound here.",
    "stationarity": "Largest difference of a species' potential, in any fluid, from that of its "
    "elements.",
    "tangent plane": "Lowest that any trial phase came, over RT; below zero would be a better "
    "state.",
    "starts": "Trial phases tried. No better state found; no rigorous bound.",
}
"""What the figures mean where the end state was searched for and cannot be bounded."""
BOUND = " The gap is a bound by weak duality, whatever way the state was found."
_HEADER = 26


class ProofView(QScrollArea):
    """Figures, restrictions with their costs, absent phases, and the model they rest on."""

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.setWidgetResizable(True)
        self.setFocusPolicy(self.focusPolicy().NoFocus)
        self.figures = FiguresTable(theme, "proof of the end state", 120)
        self.held_back = FiguresTable(theme, "restrictions and what each costs", 430, 150)
        self.absent = FiguresTable(theme, "condensed candidates that did not form", 250)
        self.absent.setMinimumHeight(_HEADER + 3 * ROW_HEIGHT)
        page = QWidget()
        layout = QVBoxLayout(page)
        layout.setContentsMargins(0, 0, GRID // 2, 0)
        layout.setSpacing(GRID)
        for table in (self.figures, self.held_back):
            layout.addWidget(table)
        layout.addWidget(self.absent, 1)
        self.model_line = Sentence("muted")
        layout.addWidget(self.model_line)
        layout.addStretch(0)
        self.setWidget(page)

    def show_answer(self, answer, stale: bool) -> None:  # type: ignore[no-untyped-def]
        """Show the proof of an answer."""
        proof = answer.end.proof
        self._show_figures(answer.end, stale)
        self._show_costs(answer, stale)
        names = {sp.key: sp.name for sp in answer.end.species}
        near = sorted(proof.absent.items(), key=lambda item: -item[1])
        self.absent.model.show(
            ("condensed, did not form", "activity", "margin, %"),
            [
                (
                    Words(f"{formula_text(k)}  {names.get(k, '')}", k),
                    float(a),
                    100.0 * (1.0 - a),
                )
                for k, a in near
            ],
            stale,
        )
        self.absent.setVisible(bool(near))
        self.model_line.say(
            typeset(proof.model)
            + (BOUND if proof.rigorous else "")
            + " A condensed candidate forms where its activity would reach 1."
        )

    def clear(self) -> None:
        """Show nothing."""
        for table in (self.figures, self.held_back, self.absent):
            table.model.show((), [], False)
            table.note.say("")
        self.held_back.hide()
        self.model_line.say("")

    def _show_figures(self, end, stale: bool) -> None:  # type: ignore[no-untyped-def]
        from solver import proof as limits
        from solver.real.proof import STATIONARITY_LIMIT

        proof = end.proof
        energy = end.fixed.pair[0] in "HUS"
        values = (
            (
                "element closure",
                _small(proof.element_residual),
                limits.ELEMENT_LIMIT,
            ),
            ("trace closure", _small(proof.trace_residual), limits.TRACE_LIMIT),
            (
                "energy closure",
                _small(proof.energy_residual) if energy else "none held",
                limits.ENERGY_LIMIT,
            ),
            ("gap", gap_text(proof.gap), limits.GAP_LIMIT),
        )
        meaning = MEANING if proof.rigorous else MEANING | OF_SEARCH
        rows: list[tuple[Cell, ...]] = [
            (name, value, _limit(limit), meaning[name]) for name, value, limit in values
        ]
        if not proof.rigorous:
            rows += [
                (name, value, limit, meaning[name])
                for name, value, limit in (
                    ("stationarity", _small(proof.stationarity), _limit(STATIONARITY_LIMIT)),
                    ("tangent plane", _signed(proof.tangent_distance), ""),
                    ("starts", f"{proof.starts}", ""),
                )
            ]
        figures = self.figures
        figures.model.show(("figure", "value", "limit", "what it means"), rows, stale)
        for column in (1, 2, 3):
            figures.text_column(column, stretch=column == 3)
        figures.table.setColumnWidth(1, 104)
        figures.table.setColumnWidth(2, 74)
        figures.table.setFixedHeight(_HEADER + ROW_HEIGHT * len(rows))

    def _show_costs(self, answer, stale: bool) -> None:  # type: ignore[no-untyped-def]
        costs = getattr(answer.end.proof, "restrictions", ())
        self.held_back.setVisible(bool(costs))
        if not costs:
            self.held_back.model.show((), [], False)
            return
        flow = answer.basis == "flow"
        sealed = PAIRS[answer.end.fixed.pair].holds_volume
        largest = max((cost.energy for cost in costs), key=abs)
        value, unit = readings.energy(largest, flow)
        factor = value / largest if largest else 1.0
        rows: list[tuple[Cell, ...]] = [
            (Words(formulas(cost.restriction), cost.restriction), float(cost.energy * factor))
            for cost in costs
        ]
        self.held_back.model.show(("held back", f"costs, {unit}"), rows, stale)
        self.held_back.table.setFixedHeight(_HEADER + ROW_HEIGHT * len(rows))
        which, where = ("Helmholtz", "T and V") if sealed else ("Gibbs", "T and p")
        self.held_back.note.say(
            f"Costs: how much lower in {which} energy the same matter would lie at the same "
            f"{where} without that restriction."
        )

    def copy(self) -> None:
        """Put all tables on the clipboard."""
        shown = [t for t in (self.figures, self.held_back, self.absent) if t.model.rowCount()]
        for table in shown:
            table.table.clearSelection()
        texts = [clipboard.as_text(table.table) for table in shown]
        QGuiApplication.clipboard().setText("\n\n".join([*texts, self.model_line.text()]))


def _small(value: float) -> str:
    return "0" if value == 0 else number_text(value, 2)


def _signed(value: float) -> str:
    return "0" if value == 0 else number_text(value, 2)


def _limit(value: float) -> str:
    return number_text(value, 1).replace("1 × ", "")
