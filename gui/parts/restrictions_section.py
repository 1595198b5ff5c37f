"""What is held back: a line for each restriction, typed and undone like everything else."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import Qt, QTimer
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QScrollArea, QVBoxLayout, QWidget

from gui import restriction_edits as edits
from gui.fields.quantity_field import LiveLine, QuantityField
from gui.fields.species_completer import SpeciesCompleter
from gui.parts.card import Label, Sentence, link
from gui.parts.carrier_choice import CarrierChoice
from gui.restriction_edits import KINDS, Kind
from gui.session import Session
from gui.theme import GRID, sized
from solver.project.model import Quantity

MOST_SHOWN = 3
"""Lines that are seen at once; more are reached by scrolling."""
_LINE = 30


class RestrictionLine(QWidget):
    """Edits restriction number `index`: its kind, what it is about, and its value."""

    def __init__(self, session: Session, index: int) -> None:
        super().__init__()
        self._session = session
        self.index = index
        self.kind = QComboBox()
        self.kind.setFont(sized(self.kind.font(), "small"))
        self.kind.setAccessibleName("kind of restriction")
        self.kind.setFixedWidth(100)
        for kind in KINDS.values():
            self.kind.addItem(kind.words, kind.name)
        self.about = LiveLine()
        self.about.setFont(sized(self.about.font(), "small"))
        self.completer = SpeciesCompleter(parent=self.about)
        self.values = {k.name: _value_field(k) for k in KINDS.values() if k.value}
        self.remove = link("×", "Remove this restriction")
        self.remove.setFixedWidth(22)
        self.remove.setAccessibleName("remove this restriction")
        self.sentence = Sentence()
        self.carrier = CarrierChoice(session)
        row = QHBoxLayout()
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(GRID // 2)
        row.addWidget(self.kind)
        row.addWidget(self.about, 1)
        for field in self.values.values():
            row.addWidget(field)
        row.addWidget(self.remove)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(2)
        column.addLayout(row)
        column.addWidget(self.carrier)
        column.addWidget(self.sentence)
        self.carrier.picked.connect(self._pick_carrier)
        self.kind.activated.connect(self._pick)
        self.about.textEdited.connect(self._type_about)
        self.completer.activated.connect(
            lambda _: QTimer.singleShot(0, self.about, lambda: self._type_about(self.about.text()))
        )
        self.about.left.connect(session.end_visit)
        for field in self.values.values():
            field.typed.connect(self._type_value)
            field.left.connect(session.end_visit)
        self.remove.clicked.connect(self._remove)
        self._completing = False

    @property
    def value(self) -> QuantityField | None:
        """The field of the value that this kind has."""
        return self.values.get(self._typed().kind)

    def _typed(self) -> Any:
        return self._session.case.restrictions[self.index]

    def refresh(self) -> None:
        """Show the restriction as the session holds it."""
        typed = self._typed()
        kind = KINDS[typed.kind]
        self.kind.setCurrentIndex(self.kind.findData(kind.name))
        self.about.setPlaceholderText(kind.about)
        self.about.set_hint(kind.hint)
        self.about.setAccessibleName(kind.about)
        self._complete(kind)
        text = edits.about_text(typed)
        if edits.read_about(typed.kind, self.about.text()) != edits.read_about(typed.kind, text):
            self.about.setText(text)
            self.about.setCursorPosition(0)  # the beginning of a long reaction is seen
        for name, field in self.values.items():
            field.setVisible(name == kind.name)
        if kind.value:
            quantity = getattr(typed, kind.value)
            empty = quantity is None or quantity.value == ""
            self.values[kind.name].show_quantity(None if empty else quantity)
        self.carrier.setVisible(kind.name == "approach")
        if kind.name == "approach":
            self.carrier.show_choice(typed.reaction, typed.key)
        self.show_faults()

    def _complete(self, kind: Kind) -> None:
        """Offers come where a single species is typed."""
        wanted = kind.single
        if wanted and not self._completing:
            self.completer.attach(self.about)
            self._completing = True
        self.completer.enabled = wanted

    def show_faults(self) -> None:
        """Mark the faulty half and say what is wrong beneath."""
        path = f"restrictions[{self.index}]"
        kind = KINDS[self._typed().kind]
        found = self._session.faults_at(path)
        at_value = [f.text for f in found if kind.value and f.field == f"{path}.{kind.value}"]
        others = [f.text for f in found if f.text not in at_value and f.field != f"{path}.key"]
        self.about.set_fault("\n".join(others))
        if kind.value:
            self.values[kind.name].set_fault("\n".join(at_value))
        at_key = [f for f in found if f.field == f"{path}.key"]
        self.carrier.set_fault(at_key[0].text if at_key else "")
        self.sentence.say("\n".join(dict.fromkeys(f.text for f in found)))

    # -- editing

    def _edit(self, new: Any, label: str, part: str | None) -> None:
        case = edits.put(self._session.case, self.index, new)
        field = None if part is None else f"restrictions[{self.index}].{part}"
        self._session.edit_case(case, label, field)

    def _pick(self, at: int) -> None:
        name = self.kind.itemData(at)
        self._edit(edits.turned(self._typed(), name), f"restriction: {KINDS[name].words}", None)

    def _type_about(self, text: str) -> None:
        self._edit(edits.with_about(self._typed(), text), "type restriction", "about")

    def _type_value(self, quantity: Quantity | None) -> None:
        self._edit(edits.with_value(self._typed(), quantity), "type restriction", "value")

    def _pick_carrier(self, key: str) -> None:
        label = f"shift carried by {key or 'the solver’s choice'}"
        self._edit(edits.with_key(self._typed(), key), label, None)

    def _remove(self) -> None:
        case = edits.removed(self._session.case, self.index)
        self._session.edit_case(case, "remove restriction")


class RestrictionsSection(QWidget):
    """As many lines as the case has restrictions; `add` belongs in the head of the card."""

    def __init__(self, session: Session) -> None:
        super().__init__()
        self._session = session
        self.lines: list[RestrictionLine] = []
        self.add = link("+ restriction", "Hold the mixture short of full equilibrium")
        self.add.setFont(sized(self.add.font(), "small"))
        self.add.clicked.connect(lambda: self.add_line())
        self._title = Label("held back", "muted", "small")
        inner = QWidget()
        self._column = QVBoxLayout(inner)
        self._column.setContentsMargins(0, 0, GRID // 2, 0)
        self._column.setSpacing(GRID // 2)
        self._area = QScrollArea()
        self._area.setWidgetResizable(True)
        self._area.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self._area.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self._area.setWidget(inner)
        outer = QVBoxLayout(self)
        outer.setContentsMargins(0, GRID // 2, 0, 0)
        outer.setSpacing(2)
        outer.addWidget(self._title)
        outer.addWidget(self._area)
        session.document_changed.connect(self.refresh)
        session.answer_changed.connect(self.show_faults)
        self.refresh()

    def refresh(self) -> None:
        """Show the restrictions of the session's case."""
        count = len(self._session.case.restrictions)
        while len(self.lines) > count:
            line = self.lines.pop()
            focus = line.window().focusWidget()
            if focus is not None and line.isAncestorOf(focus):
                self.add.setFocus()
            self._column.removeWidget(line)
            line.hide()
            line.deleteLater()
        while len(self.lines) < count:
            line = RestrictionLine(self._session, len(self.lines))
            self.lines.append(line)
            self._column.addWidget(line)
            line.show()  # a line that is hidden would not count in the height
            line.sentence.shown_or_hidden.connect(self._fit)
            line.carrier.shown_or_hidden.connect(self._fit)
        for line in self.lines:
            line.refresh()
        self.setVisible(count > 0)
        self._fit()

    def show_faults(self) -> None:
        """Follow the answer."""
        for line in self.lines[: len(self._session.case.restrictions)]:
            line.show_faults()

    def add_line(self) -> None:
        """Add an empty restriction and go to it."""
        self._session.edit_case(edits.added(self._session.case), "add restriction")
        line = self.lines[-1]
        QTimer.singleShot(0, line, lambda: self._enter(line))

    def _enter(self, line: RestrictionLine) -> None:
        self._area.ensureWidgetVisible(line)
        line.about.setFocus()

    def _fit(self) -> None:
        wanted = self._column.sizeHint().height() + 2
        self._area.setFixedHeight(min(wanted, MOST_SHOWN * _LINE + 44))


def _value_field(kind: Kind) -> QuantityField:
    field = QuantityField(kind.measure, kind.unit, optional=True)
    field.setFont(sized(field.font(), "small"))
    field.setFixedWidth(74)
    field.setPlaceholderText(kind.empty)
    field.set_hint(kind.value_hint)
    field.setAccessibleName(f"value: {kind.words}")
    return field
