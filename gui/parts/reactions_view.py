"""The view "Reactions": the independent set with K and Q, one's own set, and the hand check."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import (
    QButtonGroup,
    QComboBox,
    QHBoxLayout,
    QStackedWidget,
    QToolButton,
    QVBoxLayout,
    QWidget,
)

from gui import reaction_rows
from gui.document import replaced
from gui.fields.lines_field import LinesField
from gui.parts.card import Sentence, choice, link
from gui.parts.figures_view import FiguresTable
from gui.readings import Units
from gui.session import Session
from gui.theme import GRID, Theme, sized
from solver.errors import SettleError

SET, AMOUNTS, ENERGY = range(3)
_MOST_NOTES = 3
BY_HAND_IDEAL = (
    "Nothing is shown here: a reaction is worked out by hand for an ideal gas only, and this end "
    "state was settled with an equation of state. The set has K and Q of the real gas."
)


class ReactionsView(QWidget):
    """Reads the reactions off an answer when it is looked at; `corner` holds its choices."""

    def __init__(self, session: Session, theme: Theme) -> None:
        super().__init__()
        self._session = session
        self._answer: Any = None
        self._units = Units()
        self._stale = False
        self._view: Any = None
        self._chosen: tuple[Any, Any] | None = None
        self._tables: list[reaction_rows.Table] = []
        self.corner = QWidget()
        self.pages = QStackedWidget()
        self._build_corner()
        self._build_top()
        self._build_set(theme)
        self._build_hand(theme)
        self.line = Sentence("muted")
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.setSpacing(GRID // 2)
        layout.addWidget(self.top)
        layout.addWidget(self.pages, 1)
        layout.addWidget(self.line)
        self.which.activated.connect(lambda _: self._fill())
        session.document_changed.connect(self._follow)
        self.turn(SET)

    def _build_corner(self) -> None:
        row = QHBoxLayout(self.corner)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(0)
        self.as_set = choice("set", "Independent reactions with K and Q")
        self.by_hand = choice("by hand", "One reaction worked out as with a calculator")
        _one_of(self, row, (self.as_set, self.by_hand))
        self.as_set.clicked.connect(lambda: self.turn(SET))
        self.by_hand.clicked.connect(lambda: self.turn(AMOUNTS))
        self.own_link = link("own reactions", "Write the reactions yourself, one a line")
        self.own_link.setCheckable(True)
        self.own_link.setFont(sized(self.own_link.font(), "small"))
        self.own_link.toggled.connect(self._toggle_own)
        row.addWidget(self.own_link)

    def _build_top(self) -> None:
        self.top = QWidget()
        row = QHBoxLayout(self.top)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(0)
        self.which = QComboBox()
        self.which.setAccessibleName("reaction that is worked out by hand")
        self.which.setFont(sized(self.which.font(), "small"))
        self.which.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToContents)
        row.addWidget(self.which)
        row.addSpacing(GRID)
        self.as_amounts = choice("amounts", "The stoichiometric table")
        self.as_energy = choice("energy", "The energy balance, term by term")
        _one_of(self, row, (self.as_amounts, self.as_energy))
        self.as_amounts.clicked.connect(lambda: self.turn(AMOUNTS))
        self.as_energy.clicked.connect(lambda: self.turn(ENERGY))
        row.addStretch(1)

    def _build_set(self, theme: Theme) -> None:
        page = QWidget()
        self.set = FiguresTable(theme, "independent reactions", 196, 80, ".000")
        self.set.table.setFont(sized(self.font(), "small"))
        self.set.table.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAsNeeded)
        self.own = LinesField(2)
        self.own.setPlaceholderText(
            "one reaction a line, such as CO + H2O = CO2 + H2; empty: a readable set is chosen"
        )
        self.own.setAccessibleName("own reactions, one a line")
        self.own.typed.connect(self._type)
        self.own.left.connect(self._session.end_visit)
        self.own.hide()
        self.own_sentence = Sentence()
        column = QVBoxLayout(page)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(GRID // 2)
        column.addWidget(self.set, 1)
        column.addWidget(self.own)
        column.addWidget(self.own_sentence)
        self.pages.addWidget(page)

    def _build_hand(self, theme: Theme) -> None:
        page = QWidget()
        row = QHBoxLayout(page)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(GRID * 3)
        self.amounts = FiguresTable(theme, "stoichiometric table", 90, 84, ".0000")
        self.trials = FiguresTable(theme, "extents tried", 132, 100, ".0000")
        self.trials.table.setItemDelegateForColumn(0, self.trials._figures)
        self.trials.setFixedWidth(240)
        row.addWidget(self.amounts, 1)
        row.addWidget(self.trials)
        self.pages.addWidget(page)
        self.energy = FiguresTable(theme, "energy balance by hand", 250, 130, ".000", 6)
        for column in (2, 3):
            self.energy.text_column(column, stretch=False)
        self.pages.addWidget(self.energy)

    # -- what is looked at

    @property
    def table(self) -> QWidget:
        """The table that is looked at."""
        pages = {SET: self.set, AMOUNTS: self.amounts, ENERGY: self.energy}
        return pages[self.pages.currentIndex()].table

    def turn(self, page: int) -> None:
        """Show the set, or one reaction by hand: its amounts or its energy."""
        (self.as_set if page == SET else self.by_hand).setChecked(True)
        (self.as_energy if page == ENERGY else self.as_amounts).setChecked(True)
        if page != SET and self.pages.currentIndex() == SET:
            at = self.set.table.currentIndex()
            if at.isValid():
                self.which.setCurrentIndex(at.row())
        self.pages.setCurrentIndex(page)
        self._fill()

    def _toggle_own(self, on: bool) -> None:
        self._show_own()
        if on:
            self.turn(SET)
            self.own.setFocus()

    def _show_own(self) -> None:
        self.own.setVisible(self.own_link.isChecked() or bool(self._session.case.reactions))

    # -- editing

    def _type(self, lines: tuple[str, ...]) -> None:
        case = replaced(self._session.case, reactions=lines)
        self._session.edit_case(case, "type reactions", "reactions")

    # -- showing

    def show_answer(self, answer: Any, units: Units, stale: bool) -> None:
        """Show the reactions of an answer."""
        self._answer, self._units, self._stale = answer, units, stale
        self._read()

    def clear(self) -> None:
        """Show nothing."""
        self._answer = self._view = None
        self._fill()

    def _follow(self) -> None:
        self.own.show_lines(self._session.case.reactions)
        self._show_own()
        if self.isVisible() and self._answer is not None:
            self._read()

    def _read(self) -> None:
        """Own reactions where they can be read, else a readable set; faults at the field."""
        self.own.show_lines(self._session.case.reactions)
        self._show_own()
        own, faults = own_reactions(self._session.case, self._answer)
        text = "\n".join(dict.fromkeys(str(f) for f in faults))
        self.own.set_fault(text)
        self.own_sentence.say(text)
        try:
            self._view = self._reactions_of(own)
        except SettleError as error:
            self._view = None
            self._fill()
            self.line.say(str(error))
            return
        self._own = bool(own)
        names = [r.pretty for r in self._view.reactions]
        if names != [self.which.itemText(i) for i in range(self.which.count())]:
            self.which.clear()
            self.which.addItems(names)
        self._fill()

    def _reactions_of(self, own: tuple[Any, ...]) -> Any:
        """The view for one's own set, or the chosen one, which is found once for an answer."""
        from solver.project.case import reactions_of

        if own:
            return reactions_of(_with_reactions(self._answer, own))
        if self._chosen is None or self._chosen[0] is not self._answer:
            self._chosen = (self._answer, reactions_of(_with_reactions(self._answer, ())))
        return self._chosen[1]

    def _fill(self) -> None:
        page = self.pages.currentIndex()
        self.top.setVisible(page != SET)
        self._tables = []
        if self._view is None:
            for table in (self.set, self.amounts, self.trials, self.energy):
                table.model.show((), [], False)
            self.line.say("")
            return
        if page == SET:
            table = reaction_rows.set_table(self._view, self._units)
            self.set.model.show(*table, self._stale)
            self.set.table.setColumnWidth(1, 94)  # for the unit in the header
            self._tables = [table]
            notes = reaction_rows.set_notes(self._view, self._own)
            if not self._answer.prepared.gas.is_ideal:
                notes.insert(0, reaction_rows.REAL_NOTE)
            more = len(notes) - _MOST_NOTES
            notes = notes[:_MOST_NOTES] + ([f"And {more} more notes."] if more > 0 else [])
            self.line.say("\n".join([" ".join([reaction_rows.SET_NOTE, *notes[:1]]), *notes[1:]]))
            return
        self._fill_hand(page)

    def _fill_hand(self, page: int) -> None:
        from solver.reactions import hand_calculation

        shown = self.amounts if page == AMOUNTS else self.energy
        answer, flow = self._answer, self._answer.basis == "flow"
        at = max(self.which.currentIndex(), 0)
        if at >= len(self._view.reactions):
            shown.model.show((), [], False)
            self.line.say("No reaction takes place between the species that matter here.")
            return
        try:
            hand = hand_calculation(
                self._view.reactions[at],
                dict(answer.prepared.feed),
                answer.prepared.fixed,
                gas=answer.prepared.gas.key,
            )
        except SettleError as error:
            for table in (self.amounts, self.trials, self.energy):
                table.model.show((), [], False)
            self.line.say(BY_HAND_IDEAL if error.field == "gas" else str(error))
            return
        amounts = reaction_rows.amounts_table(hand, flow)
        trials = reaction_rows.trials_table(hand, flow)
        energy = reaction_rows.energy_table(hand, flow)
        self.amounts.model.show(*amounts, self._stale)
        self.trials.model.show(*trials, self._stale)
        self.energy.model.show(*energy, self._stale)
        self.energy.table.setColumnWidth(2, 66)
        self.energy.table.horizontalHeader().setStretchLastSection(True)
        self._tables = [amounts, trials] if page == AMOUNTS else [energy]
        notes = reaction_rows.hand_notes(
            hand, len(self._view.reactions), bool(answer.prepared.restrictions)
        )
        self.line.say(f"{reaction_rows.hand_line(hand, flow)}\n{notes}".rstrip())

    def copy(self) -> None:
        """Put what is looked at on the clipboard, with full figures and the sentences beneath."""
        text = reaction_rows.as_tsv(*self._tables)
        if self.pages.currentIndex() != SET and self.which.currentText():
            text = f"{self._view.reactions[max(self.which.currentIndex(), 0)].text}\n{text}"
        QGuiApplication.clipboard().setText(f"{text}\n\n{self.line.text()}\n")


def _one_of(parent: QWidget, row: QHBoxLayout, buttons: tuple[QToolButton, ...]) -> None:
    group = QButtonGroup(parent)
    for button in buttons:
        group.addButton(button)
        row.addWidget(button)


def own_reactions(case: Any, answer: Any) -> tuple[tuple[Any, ...], list[Any]]:
    """The case's own reactions, read with the names of its candidates, and what is wrong."""
    import species_db
    from solver.project.case_names import CaseNames
    from solver.project.restrictions import read_reactions

    faults: list[Any] = []
    names = CaseNames(answer.prepared.candidates, species_db.load())
    return read_reactions(case, names, faults), faults


def _with_reactions(answer: Any, own: tuple[Any, ...]) -> Any:
    from dataclasses import replace

    return replace(answer, prepared=replace(answer.prepared, reactions=own))
