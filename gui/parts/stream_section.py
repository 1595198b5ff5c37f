"""One stream inside "Going in": its name, conditions, rows and what is wrong with them."""

from __future__ import annotations

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QAction
from PySide6.QtWidgets import QHBoxLayout, QMenu, QVBoxLayout, QWidget

from gui import edits
from gui.fields.quantity_field import LiveLine, QuantityField
from gui.parts.card import Label, Sentence, link
from gui.readings import something_fed
from gui.session import Session
from gui.tables.stream_model import StreamModel
from gui.tables.stream_view import StreamView
from gui.theme import GRID, Theme, sized
from solver.project.units import is_share


class StreamSection(QWidget):
    """Edits stream number `index` of the session's case."""

    entered = Signal(int)
    """The section took the focus."""

    def __init__(
        self, session: Session, theme: Theme, index: int, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self._session = session
        self.index = index
        self.name = LiveLine()
        self.name.set_flat(heading=True)
        self.name.setAccessibleName("name of the stream")
        self.name.setPlaceholderText("name")
        self.T = QuantityField("temperature", "degC")
        self.p = QuantityField("pressure", "bar")
        self.total = QuantityField("total", "mol", optional=True)
        for field, what, width in (
            (self.T, "temperature", 82),
            (self.p, "pressure", 92),
            (self.total, "total", 110),
        ):
            field.set_flat()
            field.setFont(sized(field.font(), "small"))
            field.setFixedWidth(width)
            field.setAlignment(Qt.AlignmentFlag.AlignRight)
            field.setAccessibleName(f"{what} of the stream")
        self.T.set_hint("Temperature of the stream, with unit: 25 °C, 300 K, 80 °F")
        self.p.set_hint("Pressure of the stream, with unit: 1 bar, 24 barg, 350 psig")
        self.total.set_hint("The total that the shares in % are shares of: 100 kmol/h, 2 kg")
        self.more = link("⋯", "Remove or move this stream, insert or paste rows")
        self.more.setAccessibleName("stream menu")
        self.model = StreamModel(session, index, self)
        self.view = StreamView(session, self.model, theme)
        self.sentence = Sentence()
        self._build()
        self._connect()
        self.refresh()

    def _build(self) -> None:
        head = QHBoxLayout()
        head.setSpacing(0)
        head.addWidget(self.name, 1)
        head.addWidget(self.T)
        head.addWidget(self.p)
        head.addWidget(self.more)
        self._total_row = QWidget()
        total = QHBoxLayout(self._total_row)
        total.setContentsMargins(4, 0, 30, 0)
        total.addWidget(Label("shares of a total of", "muted", "small"))
        total.addStretch(1)
        total.addWidget(self.total)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, GRID)
        column.setSpacing(2)
        column.addLayout(head)
        column.addWidget(self._total_row)
        column.addWidget(self.view)
        column.addWidget(self.sentence)

    def _connect(self) -> None:
        for field, what in ((self.T, "T"), (self.p, "p"), (self.total, "total")):
            field.typed.connect(lambda q, what=what: self._set(what, q))
            field.left.connect(self._session.end_visit)
        self.name.textEdited.connect(lambda text: self._set("name", text))
        self.name.left.connect(self._session.end_visit)
        self.more.clicked.connect(self._menu)

    def _set(self, what: str, value: object) -> None:
        words = {"T": "temperature", "p": "pressure"}.get(what, what)
        case = edits.set_stream(self._session.case, self.index, **{what: value})
        label = f"type {words} of stream"
        self._session.edit_case(case, label, f"streams[{self.index}].{what}")

    def refresh(self) -> None:
        """Show the stream as the session holds it."""
        stream = self._session.case.streams[self.index]
        if self.name.text() != stream.name:
            self.name.setText(stream.name)
        self.T.show_quantity(stream.T)
        self.p.show_quantity(stream.p)
        self.total.show_quantity(stream.total)
        self._total_row.setVisible(
            stream.total is not None or any(is_share(a.unit) for a in stream.amounts)
        )
        self.model.refresh()

    def show_faults(self, shares: tuple[float | None, ...] | None) -> None:
        """Mark faulty fields and say what is wrong beneath them; None: shares not known yet."""
        path = f"streams[{self.index}]"
        for field, what in ((self.T, "T"), (self.p, "p"), (self.total, "total")):
            found = self._session.faults_at(f"{path}.{what}")
            field.set_fault(found[0].text if found else "")
            if what == "total" and found:
                self._total_row.show()
        faults = self._session.faults_at(path)
        quiet = not something_fed(self._session.case)  # a new project is no fault
        self.sentence.say("" if quiet else "\n".join(dict.fromkeys(f.text for f in faults)))
        if shares is not None:
            self.model.set_shares(shares)
        self.model.changed()

    def remove(self) -> None:
        """Remove the stream."""
        case = edits.remove_stream(self._session.case, self.index)
        self._session.edit_case(case, "remove stream")

    def move(self, step: int) -> None:
        """Move the stream up or down."""
        case = edits.move_stream(self._session.case, self.index, step)
        self._session.edit_case(case, "move stream")

    def _menu(self) -> None:
        menu = QMenu(self)
        for text, act in (
            ("Paste rows\tCtrl+V", self.view.paste),
            ("Remove rows\tDel", self.view.remove_rows),
            ("Move row up\tAlt+Up", lambda: self.view.move_row(-1)),
            ("Move row down\tAlt+Down", lambda: self.view.move_row(1)),
            (None, None),
            ("Move stream up", lambda: self.move(-1)),
            ("Move stream down", lambda: self.move(1)),
            ("Remove stream", self.remove),
        ):
            if text is None:
                menu.addSeparator()
                continue
            action = QAction(text, menu)
            action.triggered.connect(lambda _=False, act=act: act())
            menu.addAction(action)
        menu.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        menu.popup(self.more.mapToGlobal(self.more.rect().bottomLeft()))
