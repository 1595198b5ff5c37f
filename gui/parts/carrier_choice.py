"""Which species of a held reaction carries its temperature approach; by default none is named."""

from __future__ import annotations

from PySide6.QtCore import QEvent, Signal
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QWidget

from gui.parts.card import Label
from gui.restriction_edits import carriers
from gui.session import Session
from gui.theme import GRID, sized
from solver.project.wording import formula_text

AUTOMATIC = "automatic"
HINT = (
    "The species through which the reaction is held: every other reaction of that species moves "
    "with it, reactions without it stay at full equilibrium. Automatic: the first reactant that no "
    "other held reaction has."
)


class CarrierChoice(QWidget):
    """A menu of the reaction's species; `picked` tells the key, "" for automatic."""

    picked = Signal(str)
    shown_or_hidden = Signal()

    def __init__(self, session: Session) -> None:
        super().__init__()
        self._session = session
        self.label = Label("shift carried by", "muted", "small")
        self.menu = QComboBox()
        self.menu.setFont(sized(self.menu.font(), "small"))
        self.menu.setAccessibleName("species that carries the temperature approach")
        self.menu.setToolTip(HINT)
        self.menu.setMinimumWidth(110)
        self.label.setBuddy(self.menu)
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(GRID)
        row.addSpacing(100)
        row.addWidget(self.label)
        row.addWidget(self.menu)
        row.addStretch(1)
        self.menu.activated.connect(lambda at: self.picked.emit(self.menu.itemData(at)))
        self.hide()

    def event(self, event: QEvent) -> bool:
        """Tell when it comes and goes."""
        done = super().event(event)
        if event.type() in (QEvent.Type.ShowToParent, QEvent.Type.HideToParent):
            self.shown_or_hidden.emit()
        return done

    def show_choice(self, reaction: str, key: str) -> None:
        """Offer the species of the reaction; a key that is none of them stays in sight."""
        answer = self._session.answer.value
        keys = carriers(reaction, answer.prepared.candidates if answer is not None else ())
        wanted = ["", *keys, *([key] if key and key not in keys else [])]
        if wanted != [self.menu.itemData(i) for i in range(self.menu.count())]:
            self.menu.clear()
            for name in wanted:
                self.menu.addItem(formula_text(name) if name else AUTOMATIC, name)
        self.menu.setCurrentIndex(wanted.index(key))

    def set_fault(self, text: str) -> None:
        """Mark the menu as faulty; "" clears the mark."""
        value = "true" if text else "false"
        self.menu.setAccessibleDescription(text)
        self.menu.setToolTip(text or HINT)
        if self.menu.property("faulty") != value:
            self.menu.setProperty("faulty", value)
            self.menu.style().unpolish(self.menu)
            self.menu.style().polish(self.menu)
