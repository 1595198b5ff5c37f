"""The question whether changes that an earlier run could not save are wanted back."""

from __future__ import annotations

from PySide6.QtWidgets import QMessageBox, QWidget

from gui.recovery import Leftover


def ask_recover(parent: QWidget, leftover: Leftover) -> str:
    """'take', 'discard' or 'later'."""
    box = QMessageBox(parent)
    box.setWindowTitle("Unsaved changes")
    when = leftover.kept.strftime("%Y-%m-%d %H:%M")
    box.setText(f"There are unsaved changes to {leftover.name}, last kept {when}.")
    box.setInformativeText(
        "They are from a run of Thalweg that did not end as usual. Taken back, they can still be "
        "undone; the saved file stays as it is until you save."
    )
    roles = QMessageBox.ButtonRole
    take = box.addButton("Take them back", roles.AcceptRole)
    discard = box.addButton("Discard them", roles.DestructiveRole)
    later = box.addButton("Later", roles.RejectRole)
    box.setDefaultButton(take)
    box.setEscapeButton(later)
    box.exec()
    pressed = box.clickedButton()
    return "take" if pressed is take else "discard" if pressed is discard else "later"
