"""The view "Gas": the ideal answer beside the real one, and the k_ij in use."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication, QResizeEvent
from PySide6.QtWidgets import QBoxLayout, QScrollArea, QVBoxLayout, QWidget

from gui import readings
from gui.parts.beside_part import BesidePart, Settle, settle_beside
from gui.parts.card import Label, Sentence
from gui.session import Session
from gui.tables import clipboard
from gui.tables.edit_view import HEADER
from gui.tables.interactions_model import InteractionsModel
from gui.tables.interactions_view import InteractionsView
from gui.theme import GRID, ROW_HEIGHT, Theme

BESIDE_WIDTH, PAIRS_WIDTH = 456, 380
QWIDGETSIZE_MAX = (1 << 24) - 1
TITLE = "interaction parameters k_ij"
MEANING = (
    "k_ij lowers the attraction between two species below the mean of their own; what is not "
    "listed is zero. Type over a published value to use your own, Del takes yours away."
)
NOT_USED = "The gas is ideal: these k_ij are kept, but not used."


class GasView(QScrollArea):
    """Compares at the left, is typed in at the right; one above the other where it is narrow."""

    def __init__(self, session: Session, theme: Theme, settle: Settle = settle_beside) -> None:
        super().__init__()
        self._session = session
        self._asked: tuple[Any, ...] = ()
        self.setWidgetResizable(True)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.beside = BesidePart(session, theme, settle)
        self.model = InteractionsModel(session, self)
        self.view = InteractionsView(session, self.model, theme)
        self.view.setMinimumHeight(HEADER + 5 * ROW_HEIGHT)
        self.title = Label(TITLE, "muted", "small")
        self.title.setBuddy(self.view)
        self.faults = Sentence()
        self.note = Sentence("muted")
        self.pairs = QWidget()
        right = QVBoxLayout(self.pairs)
        right.setContentsMargins(0, GRID // 2, 0, 0)
        right.setSpacing(GRID // 2)
        right.addWidget(self.title)
        right.addWidget(self.view, 1)
        right.addWidget(self.faults)
        right.addWidget(self.note)
        page = QWidget()
        self._parts = QBoxLayout(QBoxLayout.Direction.LeftToRight, page)
        self._parts.setContentsMargins(0, 0, 0, 0)
        self._parts.setSpacing(GRID * 2)
        self._parts.addWidget(self.beside)
        self._parts.addWidget(self.pairs)
        self.setWidget(page)
        session.document_changed.connect(self.refresh)
        session.answer_changed.connect(self.show_faults)
        self.refresh()

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Side by side where there is room."""
        super().resizeEvent(event)
        wide = event.size().width() >= BESIDE_WIDTH + PAIRS_WIDTH + GRID * 2
        ways = QBoxLayout.Direction
        self._parts.setDirection(ways.LeftToRight if wide else ways.TopToBottom)
        self.beside.setMaximumWidth(BESIDE_WIDTH if wide else QWIDGETSIZE_MAX)

    @property
    def table(self) -> QWidget:
        """The table that takes the focus: the one that is typed in, where it is shown."""
        return self.view if self._shows_pairs() else self.beside.figures.table

    def _shows_pairs(self) -> bool:
        case = self._session.case
        return case.gas != "ideal" or bool(case.interactions)

    def refresh(self) -> None:
        """Follow the document."""
        self.model.refresh()
        self.pairs.setVisible(self._shows_pairs())
        self.note.say(NOT_USED if self._session.case.gas == "ideal" else MEANING)
        self.show_faults()

    def show_faults(self) -> None:
        """Published pairs of the answer's candidates, and what is wrong with one's own."""
        from solver.gas_model import GasModel
        from solver.project.gas import pairs_of

        found = self._session.faults_at("interactions")
        self.faults.say("\n".join(dict.fromkeys(fault.text for fault in found)))
        answer, key = self._session.answer.value, self._session.case.gas
        if answer is None:
            self.title.setText(TITLE)
            self.model.show_published((), {})
            return
        candidates = answer.prepared.candidates
        if self._asked[:2] != (key, candidates):
            self._asked = (key, candidates, pairs_of(GasModel(key), candidates))
        own = {frozenset(pair[:2]): pair[2] for pair in answer.prepared.gas.interactions}
        self.model.show_published(self._asked[2], own)
        none = key != "ideal" and not self._asked[2]
        self.title.setText(f"{TITLE}; none published is at hand here" if none else TITLE)

    def show_answer(self, answer: Any, units: readings.Units, stale: bool) -> None:
        """Show the comparison of an answer."""
        self.beside.show_answer(answer, units, stale)

    def clear(self) -> None:
        """Show no comparison."""
        self.beside.clear()

    def copy(self) -> None:
        """Put both tables on the clipboard."""
        tables = [self.beside.figures.table, self.view]
        texts = []
        for table, shown in zip(
            tables, (self.beside.figures.model.rowCount() > 0, self._shows_pairs()), strict=True
        ):
            if shown:
                table.clearSelection()
                texts.append(clipboard.as_text(table))
        QGuiApplication.clipboard().setText("\n\n".join(texts))
