"""Title and notes of the project, name and notes of the case."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QDialog,
    QDialogButtonBox,
    QLineEdit,
    QPlainTextEdit,
    QVBoxLayout,
    QWidget,
)

from gui.document import Document, replaced
from gui.parts.card import Label
from gui.session import Session
from gui.theme import GRID


class NotesDialog(QDialog):
    """All four texts; accepted, they are one edit."""

    def __init__(self, session: Session, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setWindowTitle("Title and notes")
        self._session = session
        project, case = session.project, session.case
        self.title = QLineEdit(project.title)
        self.title.setPlaceholderText("what the project is called, such as a plant and its duty")
        self.notes = QPlainTextEdit(project.notes)
        self.name = QLineEdit(case.name)
        self.case_notes = QPlainTextEdit(case.notes)
        layout = QVBoxLayout(self)
        layout.setSpacing(GRID // 2)
        for words, field in (
            ("Title of the project", self.title),
            ("Notes on the project", self.notes),
            ("Name of this case", self.name),
            ("Notes on this case", self.case_notes),
        ):
            label = Label(words, "muted", "small")
            label.setBuddy(field)
            field.setAccessibleName(words)
            layout.addWidget(label)
            layout.addWidget(field)
            if isinstance(field, QPlainTextEdit):
                field.setTabChangesFocus(True)
                field.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        buttons = QDialogButtonBox(
            QDialogButtonBox.StandardButton.Ok | QDialogButtonBox.StandardButton.Cancel
        )
        buttons.accepted.connect(self.accept)
        buttons.rejected.connect(self.reject)
        layout.addSpacing(GRID)
        layout.addWidget(buttons)
        self.resize(560, 520)

    def accept(self) -> None:
        """Take the texts over as one step that can be undone."""
        session = self._session
        case = replaced(
            session.case, name=self.name.text().strip(), notes=self.case_notes.toPlainText()
        )
        document = session.document.with_case(case)
        project = replaced(
            document.project, title=self.title.text().strip(), notes=self.notes.toPlainText()
        )
        session.edit(Document(project, document.index), "title and notes")
        super().accept()
