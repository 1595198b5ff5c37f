"""What may form: elements, the rule, and the candidates with a check mark each."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import Qt, QTimer
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import (
    QAbstractItemView,
    QComboBox,
    QHBoxLayout,
    QHeaderView,
    QLineEdit,
    QTableView,
    QToolButton,
)

from gui import edits
from gui.fields.species_completer import SpeciesCompleter
from gui.parts.card import Card, Label, Sentence, choice, link
from gui.session import Session
from gui.tables.candidates_model import CandidateRow, CandidatesModel
from gui.tables.check_delegate import CheckDelegate
from gui.theme import GRID, ROW_HEIGHT, Theme, sized
from solver.project.wording import number_text

RULES = (
    ("short", "usual species"),
    ("all", "every species"),
    ("listed", "only those added"),
)
PHASES = (("gas", "gas"), ("liquid", "liquid"), ("solid", "solid"))


class CandidateView(QTableView):
    """Space puts or takes the check mark of the current row."""

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Space works in every column."""
        at = self.currentIndex()
        if event.key() == Qt.Key.Key_Space and at.isValid():
            mark = at.siblingAtColumn(0)
            on = mark.data(Qt.ItemDataRole.CheckStateRole) == Qt.CheckState.Checked
            state = Qt.CheckState.Unchecked if on else Qt.CheckState.Checked
            self.model().setData(mark, state, Qt.ItemDataRole.CheckStateRole)
            return
        super().keyPressEvent(event)


class MayForm(Card):
    """Edits the candidates of the session's case."""

    def __init__(
        self, session: Session, theme: Theme, resolve: Callable[[str], str] | None = None
    ) -> None:
        super().__init__("May form")
        self._session = session
        self._resolve = resolve or _library_key
        self._order: list[str] = []
        self._names: dict[str, str] = {}
        self._case_index = session.document.index
        self._build(theme)
        self._connect()
        self.refresh()

    def _build(self, theme: Theme) -> None:
        top = QHBoxLayout()
        top.setSpacing(GRID // 2)
        self.chips = QHBoxLayout()
        self.chips.setSpacing(GRID // 2)
        top.addLayout(self.chips)
        self.element = QLineEdit()
        self.element.setPlaceholderText("+ element")
        self.element.setFixedWidth(84)
        self.element.setProperty("flat", "true")
        self.element.setAccessibleName("add an element by its symbol")
        top.addWidget(self.element)
        top.addStretch(1)
        self.body.addLayout(top)
        second = QHBoxLayout()
        second.setSpacing(0)
        self.rule = QComboBox()
        self.rule.setFont(sized(self.rule.font(), "small"))
        self.rule.setAccessibleName("rule for the list of candidates")
        for name, words in RULES:
            self.rule.addItem(words, name)
        second.addWidget(self.rule)
        self.rule_link = link("rule", "Say the rule in words")
        self.rule_link.setCheckable(True)
        self.rule_link.setFont(sized(self.rule_link.font(), "small"))
        second.addWidget(self.rule_link)
        second.addStretch(1)
        self.phases: dict[str, QToolButton] = {}
        for name, words in PHASES:
            self.phases[name] = choice(words, f"Allow {words} species")
            second.addWidget(self.phases[name])
        self.body.addLayout(second)
        self.rule_sentence = Sentence("muted")
        self.body.addWidget(self.rule_sentence)
        self.sentence = Sentence()
        self.body.addWidget(self.sentence)
        self.model = CandidatesModel(self)
        self.view = CandidateView()
        self.view.setModel(self.model)
        self.view.setItemDelegate(CheckDelegate(theme, self))
        self.view.setShowGrid(False)
        self.view.setTabKeyNavigation(False)
        self.view.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.view.setSelectionMode(QAbstractItemView.SelectionMode.SingleSelection)
        self.view.setAccessibleName("species that may form")
        self.view.verticalHeader().hide()
        self.view.verticalHeader().setDefaultSectionSize(ROW_HEIGHT - 2)
        self.view.horizontalHeader().hide()
        self.view.horizontalHeader().setSectionResizeMode(1, QHeaderView.ResizeMode.Stretch)
        self.view.setColumnWidth(0, 124)
        self.view.setColumnHidden(2, True)  # the remark is painted at the end of the name's cell
        self.view.setMinimumHeight(ROW_HEIGHT * 2)
        self.body.addWidget(self.view, 1)
        self.search = QLineEdit()
        self.search.setPlaceholderText("add a species by key, name or formula")
        self.search.setAccessibleName("add a species to the candidates")
        self.completer = SpeciesCompleter(parent=self.search)
        self.completer.attach(self.search)
        self.body.addWidget(self.search)
        self.search_sentence = Sentence()
        self.body.addWidget(self.search_sentence)
        self.excluded = Label("", "muted", "small")
        self.body.addWidget(self.excluded)

    def _connect(self) -> None:
        self.element.returnPressed.connect(self._add_element)
        self.rule.activated.connect(self._pick_rule)
        self.rule_link.toggled.connect(lambda _: self.refresh())
        for name, button in self.phases.items():
            button.clicked.connect(lambda on, name=name: self._pick_phase(name, on))
        self.model.toggled.connect(self._toggle)
        self.search.returnPressed.connect(self._add_species)
        self.completer.activated.connect(
            lambda _: QTimer.singleShot(0, self.search, self._add_species)
        )
        self.search.textEdited.connect(lambda _: self.search_sentence.say(""))
        self._session.document_changed.connect(self.refresh)
        self._session.answer_changed.connect(self.show_answer)

    # -- showing

    def refresh(self) -> None:
        """Show rule, phases and exclusions of the session's case."""
        from solver.project.candidates import RULES as SENTENCES

        if self._case_index != self._session.document.index or not self._session.undo_stack.count():
            self._case_index = self._session.document.index
            self._order = []
        wish = self._session.case.candidates
        self.rule.setCurrentIndex(self.rule.findData(wish.rule))
        self.rule.setToolTip(SENTENCES[wish.rule])
        self.rule_sentence.say(SENTENCES[wish.rule] if self.rule_link.isChecked() else "")
        for name, button in self.phases.items():
            button.setChecked(name in wish.phases)
        self.show_answer()

    def show_answer(self) -> None:
        """Candidates, their fate, and what is wrong with the wish."""
        answer = self._session.answer
        found = self._session.faults_at("candidates")
        self.sentence.say("\n".join(f.text for f in found))
        if answer.value is None:
            self._order = []
            self.model.show([])
            self._show_chips(set())
            self.remark.setText("")
            return
        settled = answer.state == "settled"
        wish = self._session.case.candidates
        species = answer.value.prepared.candidates
        self._names |= {sp.key: sp.name for sp in species}
        keys = [sp.key for sp in species]
        wanted = dict.fromkeys([*keys, *wish.added, *wish.excluded])
        if set(self._order) != set(wanted):
            self._order = []
            keys = sorted(keys, key=_by_fate(answer.value.end))
            wanted = dict.fromkeys([*keys, *wish.added, *wish.excluded])
            self._order = list(wanted)
        remarks = self._remarks(answer.value.end) if settled else {}
        self.model.show(
            [
                CandidateRow(k, self._names.get(k, ""), k not in wish.excluded, remarks.get(k, ""))
                for k in self._order
            ]
        )
        self._show_chips({e for sp in answer.value.prepared.feed for e in sp.elements})
        self.remark.setText(f"{len(keys)} species" if settled else "")
        out = wish.excluded
        self.excluded.setText("excluded: " + ", ".join(out) if out else "")
        self.excluded.setVisible(bool(out))

    def _remarks(self, end) -> dict[str, str]:  # type: ignore[no-untyped-def]
        out = {k: f"activity {number_text(a, 2)}" for k, a in end.proof.absent.items()}
        out |= {k: "forms" for k, n in end.phase_amounts.items() if n > 0}
        out |= dict.fromkeys(end.left_out, "left out, see Phases")
        return out | dict.fromkeys(end.outside_range, "outside data range")

    def _show_chips(self, fed: set[str]) -> None:
        chosen = self._session.case.candidates.elements
        symbols = sorted(fed | set(chosen or ()), key=_hill)
        old = [self.chips.itemAt(i).widget() for i in range(self.chips.count())]
        if [b.text() for b in old] != symbols:
            for button in old:
                self.chips.removeWidget(button)
                button.hide()
                button.deleteLater()
            for symbol in symbols:
                self.chips.addWidget(self._chip(symbol))
        for i in range(self.chips.count()):
            button = self.chips.itemAt(i).widget()
            button.setChecked(chosen is None or button.text() in chosen)

    def _chip(self, symbol: str) -> QToolButton:
        chip = QToolButton()
        chip.setText(symbol)
        chip.setCheckable(True)
        chip.setProperty("chip", "true")
        chip.setToolTip(f"Species with {symbol} may form")
        chip.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        chip.clicked.connect(lambda on: self._pick_element(symbol, on))
        return chip

    # -- editing

    def _edit(self, label: str, **changes: object) -> None:
        self._session.edit_case(edits.set_candidates(self._session.case, **changes), label)

    def _fed(self) -> set[str]:
        value = self._session.answer.value
        return {e for sp in value.prepared.feed for e in sp.elements} if value else set()

    def _pick_element(self, symbol: str, on: bool) -> None:
        fed = self._fed()
        chosen = self._session.case.candidates.elements
        now = set(fed if chosen is None else chosen)
        now = now | {symbol} if on else now - {symbol}
        elements = None if now == fed else tuple(sorted(now, key=_hill))
        self._edit(f"{'allow' if on else 'leave out'} {symbol}", elements=elements)

    def _add_element(self) -> None:
        from species_db import ATOMIC_MASS

        text = self.element.text().strip()
        symbol = text[:1].upper() + text[1:].lower()
        if symbol not in ATOMIC_MASS:
            self.search_sentence.say(
                f"“{text}” is no symbol of an element; write for example C, Fe or Cl."
            )
            return
        self.search_sentence.say("")
        self.element.clear()
        self._pick_element(symbol, True)

    def _pick_rule(self, at: int) -> None:
        self._edit(f"candidates: {self.rule.itemText(at)}", rule=self.rule.itemData(at))

    def _pick_phase(self, name: str, on: bool) -> None:
        phases = self._session.case.candidates.phases
        kept = tuple(
            p for p, _ in PHASES if (p in phases or (p == name and on)) and (on or p != name)
        )
        self._edit(f"{'allow' if on else 'leave out'} {name} species", phases=kept)

    def _toggle(self, key: str, allowed: bool) -> None:
        case = self._session.case
        by_rule = key not in case.candidates.added
        change = edits.allow if allowed else edits.forbid
        self._session.edit_case(
            change(case, key, by_rule), f"{'allow' if allowed else 'exclude'} {key}"
        )

    def _add_species(self) -> None:
        text = self.search.text().strip()
        if not text:
            return
        try:
            key = self._resolve(text)
        except KeyError as error:
            self.search_sentence.say(str(error.args[0]) if error.args else str(error))
            return
        self.search_sentence.say("")
        self.search.clear()
        wish = self._session.case.candidates
        known = {r.key for r in self.model.rows if r.allowed}
        if key in known:
            self._session.messages.note(f"{key} is among the candidates already.")
        elif key in wish.excluded:
            self._session.edit_case(edits.allow(self._session.case, key, True), f"allow {key}")
        else:
            self._session.edit_case(edits.allow(self._session.case, key, False), f"add {key}")
        self._go_to(key)

    def _go_to(self, key: str) -> None:
        for i, row in enumerate(self.model.rows):
            if row.key == key:
                self.view.setCurrentIndex(self.model.index(i, 0))
                self.view.scrollTo(self.model.index(i, 0))


def _library_key(text: str) -> str:
    import species_db
    from solver.project.candidates import unknown_species

    try:
        return species_db.load().resolve(text)
    except species_db.UnknownSpecies as error:
        raise KeyError(str(unknown_species(error, "candidates.added"))) from None


def _by_fate(end):  # type: ignore[no-untyped-def]
    """The most abundant first, then the condensed ones by how near they are to forming."""

    def key(species: str) -> tuple[float, float]:
        return -end.amounts.get(species, 0.0), -end.proof.absent.get(species, 0.0)

    return key


def _hill(symbol: str) -> tuple[int, str]:
    """Carbon, hydrogen, then by the alphabet."""
    return ({"C": 0, "H": 1}.get(symbol, 2), symbol)
