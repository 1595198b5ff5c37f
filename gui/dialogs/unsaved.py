"""The question before unsaved changes are given up."""

from __future__ import annotations

from enum import Enum

from PySide6.QtWidgets import QMessageBox, QWidget


class Choice(Enum):
    """What the user wants done with the changes."""

    SAVE = "save"
    DISCARD = "discard"
    CANCEL = "cancel"


def ask_unsaved(parent: QWidget, name: str) -> Choice:
    """Ask about the changes of `name`."""
    box = QMessageBox(parent)
    box.setWindowTitle("Unsaved changes")
    box.setText(f"Save the changes to {name}?")
    box.setInformativeText("They are lost if you leave without saving.")
    buttons = QMessageBox.StandardButton
    box.setStandardButtons(buttons.Save | buttons.Discard | buttons.Cancel)
    box.setDefaultButton(buttons.Save)
    box.setEscapeButton(buttons.Cancel)
    pressed = box.exec()
    if pressed == buttons.Save:
        return Choice.SAVE
    return Choice.DISCARD if pressed == buttons.Discard else Choice.CANCEL
