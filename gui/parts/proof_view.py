"""The view "Proof": each figure with its limit and what it means, and the absent phases."""

from __future__ import annotations

from PySide6.QtWidgets import QVBoxLayout, QWidget

from gui.parts.answer_line import gap_text
from gui.parts.card import Sentence
from gui.parts.figures_view import FiguresTable
from gui.tables.figures_model import Cell
from gui.theme import GRID, Theme
from solver.project.wording import formula_text, number_text

MEANING = {
    "element closure": "Largest difference between the atoms at the end and the atoms fed, over "
    "the largest total.",
    "trace closure": "The same for each element over its own total, so that traces count.",
    "energy closure": "Distance of the energy or entropy from the value held, over nRT.",
    "gap": "No mixture of the candidates lies lower in Gibbs energy by more than this, over nRT.",
}


class ProofView(QWidget):
    """Figures, absent phases, and the model they rest on."""

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.figures = FiguresTable(theme, "proof of the end state", 120)
        self.absent = FiguresTable(theme, "condensed candidates that did not form", 250)
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.setSpacing(GRID)
        layout.addWidget(self.figures)
        layout.addWidget(self.absent, 1)
        self.model_line = Sentence("muted")
        layout.addWidget(self.model_line)

    def show_answer(self, answer, stale: bool) -> None:  # type: ignore[no-untyped-def]
        """Show the proof of an answer."""
        from solver import proof as limits

        end = answer.end
        proof = end.proof
        energy = end.fixed.pair[0] in "HUS"
        rows: list[tuple[Cell, ...]] = [
            (
                "element closure",
                _small(proof.element_residual),
                _limit(limits.ELEMENT_LIMIT),
                MEANING["element closure"],
            ),
            (
                "trace closure",
                _small(proof.trace_residual),
                _limit(limits.TRACE_LIMIT),
                MEANING["trace closure"],
            ),
            (
                "energy closure",
                _small(proof.energy_residual) if energy else "none held",
                _limit(limits.ENERGY_LIMIT),
                MEANING["energy closure"],
            ),
            ("gap", gap_text(proof.gap), _limit(limits.GAP_LIMIT), MEANING["gap"]),
        ]
        figures = self.figures
        figures.model.show(("figure", "value", "limit", "what it means"), rows, stale)
        for column in (1, 2, 3):
            figures.text_column(column, stretch=column == 3)
        figures.table.setColumnWidth(1, 104)
        figures.table.setColumnWidth(2, 74)
        figures.table.setFixedHeight(24 + 26 * len(rows) + 2)
        names = {sp.key: sp.name for sp in end.species}
        near = sorted(proof.absent.items(), key=lambda item: -item[1])
        self.absent.model.show(
            ("condensed, did not form", "activity", "margin, %"),
            [
                (f"{formula_text(k)}  {names.get(k, '')}", float(a), 100.0 * (1.0 - a))
                for k, a in near
            ],
            stale,
        )
        self.absent.setVisible(bool(near))
        self.model_line.say(
            proof.model + " The gap is a bound by weak duality, whatever way the state was found."
            " A condensed candidate forms where its activity would reach 1."
        )


def _small(value: float) -> str:
    return "0" if value == 0 else number_text(value, 2)


def _limit(value: float) -> str:
    return number_text(value, 1).replace("1 × ", "")
