"""The open project, its undo stack and its live answer: what every panel reads and edits."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from PySide6.QtCore import QObject, QTimer, Signal
from PySide6.QtGui import QUndoStack

from gui.colours import SpeciesColours
from gui.document import Document, ReplaceDocument, physics
from gui.jobs import Channel
from gui.messages import Messages
from solver.project.model import Case, Project

if TYPE_CHECKING:
    from solver.project.case import CaseAnswer

Settle = Callable[[Case], "CaseAnswer"]

THROTTLE = 15
"""Milliseconds that keystrokes are gathered before settling starts."""
_REMEMBERED = 12


@dataclass(frozen=True, slots=True)
class Fault:
    """A sentence that belongs to a field (a path such as "streams[0].T")."""

    field: str
    text: str


@dataclass(frozen=True, slots=True)
class Answer:
    """What is known of the current case.

    `state` is 'settled' (value belongs to what is typed), 'settling' or 'faulty'; in the last
    two `value` is the last good answer, if there was one, and must not be shown as new.
    """

    state: str
    value: CaseAnswer | None = None
    faults: tuple[Fault, ...] = ()


def settle_case(case: Case) -> CaseAnswer:
    """Settle with the real solver, loaded on first use."""
    from solver.project.case import settle_case as settle

    return settle(case)


class Session(QObject):
    """Holds the document; panels read it, send it edits and listen to its signals."""

    document_changed = Signal()
    answer_changed = Signal()
    file_changed = Signal()
    """Another file, or its modified mark."""
    slow = Signal(bool)

    def __init__(self, settle: Settle = settle_case, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._settle = settle
        self.messages = Messages(self)
        self.colours = SpeciesColours()
        self.undo_stack = QUndoStack(self)
        self.undo_stack.cleanChanged.connect(lambda _: self.file_changed.emit())
        self.path: Path | None = None
        self.document = Document(Project())
        self.answer = Answer("settling")
        self._good: list[tuple[Case, CaseAnswer]] = []
        self._visits = 0
        self._closed = False
        self._channel = Channel(self)
        self._channel.finished.connect(self._settled)
        self._channel.failed.connect(self._failed)
        self._channel.slow.connect(self.slow)
        self._throttle = QTimer(self, singleShot=True, interval=THROTTLE)
        self._throttle.timeout.connect(self._submit)
        self._asked: Case | None = None

    # -- reading

    @property
    def project(self) -> Project:
        """The project as it stands."""
        return self.document.project

    @property
    def case(self) -> Case:
        """The case that is looked at."""
        return self.document.case

    @property
    def modified(self) -> bool:
        """Whether there is something a file does not hold."""
        return not self.undo_stack.isClean()

    def faults_at(self, field: str) -> tuple[Fault, ...]:
        """The faults of a field and of everything inside it."""
        return tuple(
            f
            for f in self.answer.faults
            if f.field == field or f.field.startswith((field + ".", field + "["))
        )

    # -- editing

    def edit_case(self, case: Case, label: str, field: str | None = None) -> None:
        """Put an edited case in place; `field` merges the typing of one visit to it."""
        self.edit(self.document.with_case(case), label, field)

    def edit(self, new: Document, label: str, field: str | None = None) -> None:
        """Put an edited document in place, undoably."""
        if new == self.document:
            return
        if new.project == self.project:
            self.look_at(new.index)
            return
        visit = None if field is None else f"{new.index}/{field}/{self._visits}"
        self.undo_stack.push(ReplaceDocument(self.document, new, label, self._show, visit))

    def end_visit(self) -> None:
        """What is typed from now on is another undo step."""
        self._visits += 1

    def look_at(self, index: int) -> None:
        """Look at another case; no edit of the project."""
        if index != self.document.index:
            self._show(Document(self.project, index))

    def open_document(self, project: Project, path: Path | None) -> None:
        """Start anew with a project as it was read."""
        self.undo_stack.clear()
        self.colours.clear()
        self._good.clear()
        self.path = path
        self._show(Document(project))
        self.undo_stack.setClean()
        self.file_changed.emit()

    def saved_as(self, path: Path) -> None:
        """The project now stands in `path`."""
        self.path = path
        self.undo_stack.setClean()
        self.file_changed.emit()

    def close(self) -> None:
        """Stop settling; waits for the worker."""
        if self._closed:
            return
        self._closed = True
        # A dying stack tells of its state once more, to listeners that are no longer whole.
        self.undo_stack.blockSignals(True)
        self._throttle.stop()
        self._channel.close()

    def is_idle(self) -> bool:
        """Whether the answer is as new as it will get."""
        return not self._throttle.isActive() and self._channel.is_idle()

    def cancel(self) -> None:
        """Give up on settling the case as it stands; an edit starts it again."""
        self._throttle.stop()
        self._channel.cancel()
        fault = Fault("", "Settling was stopped. Any edit starts it again.")
        self._answer(Answer("faulty", self.answer.value, (fault,)))

    # -- settling

    def _show(self, document: Document) -> None:
        earlier = self.document
        self.document = document
        if document.index == earlier.index and document.project is earlier.project:
            return
        ask = physics(document.case) != self._asked
        if ask and (document.index != earlier.index or not self._good):
            # The last good answer is one of another case: nothing to show, not even greyed.
            self.answer = Answer("settling")
        # Panels see the new document first and the state of its answer after it.
        self.document_changed.emit()
        if ask:
            self._ask()

    def _ask(self) -> None:
        case = physics(self.case)
        self._asked = case
        known = next((a for c, a in reversed(self._good) if c == case), None)
        if known is not None:
            self._channel.cancel()
            self._throttle.stop()
            self._answer(Answer("settled", known))
            return
        self._answer(Answer("settling", self.answer.value, self.answer.faults))
        self._throttle.start()

    def _submit(self) -> None:
        case, settle = physics(self.case), self._settle
        self._channel.submit(case, lambda progress, should_stop: settle(case))

    def _settled(self, case: Case, value: CaseAnswer) -> None:
        if case != physics(self.case):
            return
        self._good = [*self._good[-_REMEMBERED:], (case, value)]
        self._answer(Answer("settled", value))

    def _failed(self, case: Case, error: Exception) -> None:
        if case != physics(self.case):
            return
        self._answer(Answer("faulty", self.answer.value, self._faults(error)))

    def _faults(self, error: Exception) -> tuple[Fault, ...]:
        from solver.errors import SettleError

        several = getattr(error, "faults", None)
        if several:
            return tuple(Fault(f.field or "", str(f)) for f in several)
        if isinstance(error, SettleError):
            return (Fault(error.field or "", str(error)),)
        self.messages.unexpected(error)
        return (Fault("", "The program failed on this input; its report can be copied."),)

    def _answer(self, answer: Answer) -> None:
        self.answer = answer
        self.answer_changed.emit()
