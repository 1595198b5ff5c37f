"""The one undoable change: another project in place of the old one."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from PySide6.QtGui import QUndoCommand

from solver.project.model import Case, Project, TemperaturePlot


@dataclass(frozen=True, slots=True)
class Document:
    """A project and the case that is looked at."""

    project: Project
    index: int = 0

    @property
    def case(self) -> Case:
        """The case that is looked at."""
        return self.project.cases[self.index]

    def with_case(self, case: Case) -> Document:
        """The same document with another case in the place of the current one."""
        cases = list(self.project.cases)
        cases[self.index] = case
        return Document(replaced(self.project, cases=tuple(cases)), self.index)


class ReplaceDocument(QUndoCommand):
    """Puts `new` where `old` was; typing in one field, in one visit, is one step.

    Parameters
    ----------
    visit
        Names the field and the visit to it; commands of equal visits merge. None: never.
    """

    def __init__(
        self,
        old: Document,
        new: Document,
        label: str,
        show: Callable[[Document], None],
        visit: str | None = None,
    ) -> None:
        super().__init__(label)
        self.old, self.new = old, new
        self._show = show
        self._visit = visit

    def redo(self) -> None:
        """Show the new document."""
        self._show(self.new)

    def undo(self) -> None:
        """Show the old document, at the case where the edit was made."""
        self._show(Document(self.old.project, min(self.old.index, len(self.old.project.cases) - 1)))

    def id(self) -> int:
        """Commands with an id of -1 never merge."""
        return -1 if self._visit is None else 1

    def mergeWith(self, other: QUndoCommand) -> bool:
        """Take over what was typed after this."""
        if not isinstance(other, ReplaceDocument) or other._visit != self._visit:
            return False
        self.new = other.new
        self.setObsolete(self.new.project == self.old.project)
        return True


def replaced(model, **changes):  # type: ignore[no-untyped-def]
    """A copy of a frozen model with some fields changed."""
    return model.model_copy(update=changes)


_NO_PLOT = TemperaturePlot()


def physics(case: Case) -> Case:
    """What the end state depends on: the case without its name, notes, plot and own reactions."""
    return replaced(case, name="", notes="", plot=_NO_PLOT, reactions=())
