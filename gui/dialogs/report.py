"""Windows of text: the report of a fault in the program, the keys, and what the program is."""

from __future__ import annotations

import platform

from PySide6.QtGui import QFontDatabase, QGuiApplication
from PySide6.QtWidgets import (
    QDialog,
    QDialogButtonBox,
    QGridLayout,
    QLabel,
    QPlainTextEdit,
    QVBoxLayout,
    QWidget,
)

from gui.parts.card import Label
from gui.theme import GRID
from gui.version import program_version
from solver.project.cautions import CANDIDATES, JUDGEMENT, LIMIT, SEALED


class BugReport(QDialog):
    """Shows an unexpected exception; the project is untouched and can be saved."""

    def __init__(self, text: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setWindowTitle("A fault in the program")
        layout = QVBoxLayout(self)
        words = QLabel(
            "Something in Thalweg itself went wrong. Your project is as you typed it and can be "
            "saved. The text below helps whoever mends it."
        )
        words.setWordWrap(True)
        layout.addWidget(words)
        self.text = QPlainTextEdit(
            f"Thalweg {program_version()}, Python {platform.python_version()}, "
            f"{platform.platform()}\n\n{text}"
        )
        self.text.setReadOnly(True)
        self.text.setFont(QFontDatabase.systemFont(QFontDatabase.SystemFont.FixedFont))
        layout.addWidget(self.text, 1)
        buttons = QDialogButtonBox(QDialogButtonBox.StandardButton.Close)
        copy = buttons.addButton("Copy", QDialogButtonBox.ButtonRole.ActionRole)
        copy.clicked.connect(lambda: QGuiApplication.clipboard().setText(self.text.toPlainText()))
        buttons.rejected.connect(self.reject)
        layout.addWidget(buttons)
        self.resize(720, 420)


class KeysDialog(QDialog):
    """All actions with their keys."""

    def __init__(self, rows: list[tuple[str, str]], parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setWindowTitle("Keyboard")
        outer = QVBoxLayout(self)
        grid = QGridLayout()
        grid.setHorizontalSpacing(GRID * 3)
        half = (len(rows) + 1) // 2
        for i, (words, keys) in enumerate(rows):
            column = 0 if i < half else 2
            grid.addWidget(QLabel(words), i % half, column)
            grid.addWidget(Label(keys, "muted"), i % half, column + 1)
        outer.addLayout(grid)
        buttons = QDialogButtonBox(QDialogButtonBox.StandardButton.Close)
        buttons.rejected.connect(self.reject)
        outer.addWidget(buttons)


class AboutDialog(QDialog):
    """What the program is, and the cautions that go with it."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setWindowTitle("About Thalweg")
        layout = QVBoxLayout(self)
        layout.setSpacing(GRID)
        layout.addWidget(Label(f"Thalweg {program_version()}", "title"))
        for text in (
            "Thalweg: the line along the bottom of a valley. The program follows the bottom of "
            "the Gibbs-energy valley as conditions change.",
            LIMIT,
            CANDIDATES,
            SEALED,
            JUDGEMENT,
        ):
            label = Label(text)
            label.setWordWrap(True)
            layout.addWidget(label)
        buttons = QDialogButtonBox(QDialogButtonBox.StandardButton.Close)
        buttons.rejected.connect(self.reject)
        layout.addWidget(buttons)
        self.setMinimumWidth(460)
