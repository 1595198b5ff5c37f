"""Where it ends up: the answer line and the views of the end state."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QButtonGroup,
    QHBoxLayout,
    QProgressBar,
    QStackedWidget,
    QTabBar,
    QWidget,
)

from gui import readings
from gui.parts.answer_line import AnswerLine
from gui.parts.card import Card, Label, Sentence, choice, link, rule
from gui.parts.composition_view import CompositionView
from gui.parts.figures_view import EnergyView
from gui.parts.gas_view import GasView
from gui.parts.phases_view import PhasesView
from gui.parts.proof_view import ProofView
from gui.parts.reactions_view import ReactionsView
from gui.readings import something_fed
from gui.session import Session
from gui.tables import clipboard
from gui.theme import GRID, Theme, sized
from solver.fixed import PAIRS
from solver.project.cautions import JUDGEMENT, LIMIT, SEALED
from solver.project.wording import typeset

ROOM = 340
"""Pixels of height below which the views need the room of all remarks but the first."""
TABS = ("Composition", "Phases", "Reactions", "Energy", "Proof", "Gas")

EMPTY = (
    "Nothing to show yet. Type a species and an amount at the left, such as CH4 and 1 kmol; "
    "the end state appears here as you type."
)
MISSING = "No end state yet. What is missing or wrong is said above and at its field."


class EndsUp(Card):
    """Shows the session's answer; greyed while it is older than what is typed."""

    def __init__(self, session: Session, theme: Theme) -> None:
        super().__init__("Where it ends up")
        self._session = session
        self._shown: object = None
        self.progress = QProgressBar()
        self.progress.setRange(0, 0)
        self.progress.setTextVisible(False)
        self.stop = link("stop", "Stop settling (Esc)")
        self.stop.clicked.connect(session.cancel)
        self.head.addWidget(self.stop)
        self.body.addWidget(self.progress)
        self._slow(False)
        self.sentence = Sentence("warning", "body")
        self.line = AnswerLine()
        self.body.addWidget(self.line)
        self.body.addWidget(self.sentence)
        self.body.addWidget(rule())
        self.tabs = QTabBar()
        self.tabs.setDrawBase(False)
        self.tabs.setExpanding(False)
        self.tabs.setAccessibleName("views of the end state")
        for title in TABS:
            self.tabs.addTab(title)
        bar = QHBoxLayout()
        bar.setSpacing(0)
        bar.addWidget(self.tabs)
        bar.addStretch(1)
        self._bars = QWidget()
        scale = QHBoxLayout(self._bars)
        scale.setContentsMargins(0, 0, 0, 0)
        scale.setSpacing(0)
        scale.addWidget(Label("bars", "muted", "small"))
        self.linear = choice("linear", "Bars in proportion to the share")
        self.logarithmic = choice("log", "Bars over eight decades (Ctrl+Shift+L)")
        group = QButtonGroup(self)
        for button in (self.linear, self.logarithmic):
            group.addButton(button)
            scale.addWidget(button)
        self.linear.setChecked(True)
        self.copy_button = link("copy", "Copy what is shown to a spreadsheet (Ctrl+Shift+C)")
        self.copy_button.setFont(sized(self.copy_button.font(), "small"))
        self.reactions = ReactionsView(session, theme)
        bar.addWidget(self._bars)
        bar.addWidget(self.reactions.corner)
        bar.addWidget(self.copy_button)
        self.reactions.corner.hide()
        self.body.addLayout(bar)
        self.composition = CompositionView(theme, session.colours)
        self.phases = PhasesView(theme)
        self.energy = EnergyView(theme)
        self.proof = ProofView(theme)
        self.gas = GasView(session, theme)
        self.pages = QStackedWidget()
        for page in (
            self.composition,
            self.phases,
            self.reactions,
            self.energy,
            self.proof,
            self.gas,
        ):
            self.pages.addWidget(page)
        self.empty = Label(EMPTY, "muted")
        self.empty.setWordWrap(True)
        self.empty.setAlignment(Qt.AlignmentFlag.AlignCenter)
        self.pages.addWidget(self.empty)
        self.body.addWidget(self.pages, 1)
        self.notes = Sentence("warning")
        self.body.addWidget(self.notes)
        self.vessel = Sentence("warning")
        self.body.addWidget(self.vessel)
        self.caution = Sentence("muted")
        self.body.addWidget(self.caution)
        self.body.setSpacing(GRID // 2)
        self.tabs.currentChanged.connect(self._turn)
        self.logarithmic.toggled.connect(self.composition.model.set_logarithmic)
        session.answer_changed.connect(self.refresh)
        session.document_changed.connect(self._recaution)
        session.slow.connect(self._slow)
        self.refresh()

    def _turn(self, page: int) -> None:
        self._show_page(page)
        self._fill()

    def _show_page(self, page: int) -> None:
        answer = self._session.answer
        # What is typed in the gas model's view must stay in reach while it is what is wrong.
        nothing = answer.value is None and answer.state == "faulty"
        if nothing and not (TABS[page] == "Gas" and something_fed(self._session.case)):
            self.empty.setText(MISSING if something_fed(self._session.case) else EMPTY)
            self.pages.setCurrentWidget(self.empty)
        else:
            self.pages.setCurrentIndex(page)
        self._bars.setVisible(TABS[page] == "Composition")
        self.reactions.corner.setVisible(TABS[page] == "Reactions")

    def _slow(self, slow: bool) -> None:
        self.progress.setVisible(slow)
        self.stop.setVisible(slow)
        if slow:
            self.remark.setText("settling")
        elif self.remark.text() == "settling":
            self.remark.setText("")

    def _recaution(self) -> None:
        fixed = self._session.case.fixed.pair
        sealed = PAIRS[fixed].holds_volume
        self.vessel.say(f"{SEALED} {JUDGEMENT}" if sealed else "")
        self.caution.say(LIMIT if sealed else f"{LIMIT} {JUDGEMENT}")

    def refresh(self) -> None:
        """Show the answer as it stands."""
        answer = self._session.answer
        stale = answer.state != "settled"
        self._recaution()
        self.sentence.say(self._reason())
        self.line.set_stale(stale)
        self.composition.model.set_stale(stale)
        self._show_page(self.tabs.currentIndex())
        if answer.value is None:
            self._shown = None
            self.line.clear()
            self.composition.model.clear()
            self.energy.model.show((), [], False)
            self.energy.note.say("")
            for view in (self.phases, self.proof, self.reactions, self.gas):
                view.clear()
            self.notes.say("")
            return
        if not stale:
            self._shown = answer.value
            units = readings.units_for(self._session.case, answer.value)
            self.line.show_answer(self._session.case, answer.value, units)
        self._fill()
        end = answer.value.end
        said = tuple(typeset(text) for text in (*end.cautions, *answer.value.messages))
        most = 3 if self.height() > ROOM else 1
        self.notes.say("" if stale else notes_text(said, most))
        self.notes.setToolTip("\n".join(said) if len(said) > most else "")

    def _fill(self) -> None:
        """Fill the page that is looked at."""
        answer = self._session.answer
        if answer.value is None:
            return
        stale = answer.state != "settled"
        units = readings.units_for(self._session.case, answer.value)
        page = self.pages.currentWidget()
        if page is self.composition:
            self.composition.show_end(answer.value.end, units, stale)
        elif page is self.phases:
            self.phases.show_answer(answer.value, units, stale)
        elif page is self.reactions:
            self.reactions.show_answer(answer.value, units, stale)
        elif page is self.energy:
            self.energy.show_answer(answer.value, units, stale)
        elif page is self.gas:
            self.gas.show_answer(answer.value, units, stale)
        else:
            self.proof.show_answer(answer.value, stale)

    def _reason(self) -> str:
        answer = self._session.answer
        if answer.state != "faulty" or not something_fed(self._session.case):
            return ""
        first = answer.faults[0].text if answer.faults else ""
        more = len(answer.faults) - 1
        lead = "" if answer.value is None else "Out of date. "
        rest = (
            ""
            if more < 1
            else f" And {more} more, at {'its field' if more == 1 else 'their fields'}."
        )
        return lead + first + rest

    def _page(self):  # type: ignore[no-untyped-def]
        """The view of the tab, also while there is nothing to show in it."""
        return self.pages.widget(self.tabs.currentIndex())

    def current_table(self) -> QWidget:
        """The table that is looked at, to copy from or to focus."""
        page = self._page()
        return page.figures.table if page is self.proof else page.table

    def copy(self) -> None:
        """Put the view that is looked at on the clipboard."""
        page = self._page()
        if page is self.composition or page is self.energy:
            page.table.clearSelection()
            clipboard.copy(page.table)
        else:
            page.copy()

    def toggle_bars(self) -> None:
        """Linear bars to logarithmic ones and back."""
        (self.linear if self.logarithmic.isChecked() else self.logarithmic).setChecked(True)

    def show_tab(self, title: str) -> None:
        """Turn to a view by its title."""
        self.tabs.setCurrentIndex(TABS.index(title))


def notes_text(messages: tuple[str, ...], most: int = 3) -> str:
    """Remarks on an answer, a line each; of many the first ones and how many more."""
    lines = list(messages[:most])
    if len(messages) > most:
        lines[-1] = f"{lines[-1]} And {len(messages) - most} more of this kind."
    return "\n".join(lines)
