"""The table of k_ij: one's own pairs, an empty row, then the published ones with their source."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, Qt

from gui import gas_edits as edits
from gui.session import Session
from gui.tables.clipboard import COPY_ROLE
from gui.tables.delegates import MUTED_ROLE
from gui.tables.stream_model import FAULT_ROLE, is_key
from solver.project.model import Interaction
from solver.project.units import UnitError, parse_number
from solver.project.wording import MINUS, formula_text, typed_number

FIRST, SECOND, K, SOURCE = range(4)
HEADERS = ("species", "with", "k_ij", "source")
FIELDS = ("a", "b", "k")
_TOP = QModelIndex()
_TEXTS = (Qt.ItemDataRole.DisplayRole, Qt.ItemDataRole.EditRole, COPY_ROLE)


class InteractionsModel(QAbstractTableModel):
    """Reads the pairs of the session's case and sends every change back as an edit.

    Typing in the empty row makes a pair; typing a value over a published one makes it one's own.
    """

    def __init__(self, session: Session, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._session = session
        self._own: tuple[Interaction, ...] = session.case.interactions
        self._published: tuple[Any, ...] = ()
        self._replaced: dict[frozenset[str], float] = {}

    @property
    def own(self) -> int:
        """How many rows are one's own; the empty row comes after them."""
        return len(self._own)

    def refresh(self) -> None:
        """Follow the session, without resetting an open editor's row."""
        new, old = self._session.case.interactions, self._own
        more = len(new) - len(old)
        if more > 0:
            # Rows come after the empty one, which then is filled: an editor in it stays open.
            self.beginInsertRows(_TOP, len(old) + 1, len(new))
            self._own = (*old, *(Interaction(),) * more)
            self.endInsertRows()
        elif more < 0:
            pairs = enumerate(zip(old, new, strict=False))
            same = next((i for i, (a, b) in pairs if a != b), len(new))
            self.beginRemoveRows(_TOP, same, same - more - 1)
            self._own = (*old[:same], *old[same - more :])
            self.endRemoveRows()
        self._own = new
        self.changed()

    def show_published(
        self, published: tuple[Any, ...], replaced: dict[frozenset[str], float]
    ) -> None:
        """Show other published pairs; `replaced` has those that one's own values stand over."""
        if published != self._published:
            start = len(self._own) + 1
            if self._published:
                self.beginRemoveRows(_TOP, start, start + len(self._published) - 1)
                self._published = ()
                self.endRemoveRows()
            if published:
                self.beginInsertRows(_TOP, start, start + len(published) - 1)
                self._published = published
                self.endInsertRows()
        self._replaced = replaced
        self.changed()

    def changed(self) -> None:
        """Values or faults may have changed; rows are the same."""
        self.dataChanged.emit(self.index(0, 0), self.index(self.rowCount() - 1, SOURCE))

    def rowCount(self, parent: QModelIndex = _TOP) -> int:
        """One's own, the empty one, the published ones."""
        return 0 if parent.isValid() else len(self._own) + 1 + len(self._published)

    def columnCount(self, parent: QModelIndex = _TOP) -> int:
        """Two species, k_ij, source."""
        return 0 if parent.isValid() else len(HEADERS)

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = 0) -> Any:
        """Column titles."""
        if orientation != Qt.Orientation.Horizontal:
            return None
        if role == Qt.ItemDataRole.DisplayRole:
            return HEADERS[section]
        return _alignment(section) if role == Qt.ItemDataRole.TextAlignmentRole else None

    def flags(self, index: QModelIndex) -> Qt.ItemFlag:
        """One's own pairs are typed whole; of a published one the value can be typed over."""
        if not index.isValid():
            return Qt.ItemFlag.NoItemFlags
        flags = Qt.ItemFlag.ItemIsSelectable | Qt.ItemFlag.ItemIsEnabled
        published = index.row() > len(self._own)
        if index.column() == K or (not published and index.column() != SOURCE):
            flags |= Qt.ItemFlag.ItemIsEditable
        return flags

    def data(self, index: QModelIndex, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        """Texts, alignment, faults and sources of a cell."""
        if not index.isValid():
            return None
        row, column = index.row(), index.column()
        if role == Qt.ItemDataRole.TextAlignmentRole:
            return _alignment(column)
        if row < len(self._own):
            return self._own_data(row, column, role)
        if row == len(self._own):
            return "" if role in _TEXTS else None
        return self._published_data(self._published[row - len(self._own) - 1], column, role)

    def _own_data(self, row: int, column: int, role: int) -> Any:
        typed = self._own[row]
        if role in _TEXTS:
            if column == K:
                return typed_number(typed.k)
            if column == SOURCE:
                return "your value" if typed.k != "" else ""
            text = typed.b if column == SECOND else typed.a
            shown = role == Qt.ItemDataRole.DisplayRole and is_key(text)
            return formula_text(text) if shown else text
        if role in (FAULT_ROLE, Qt.ItemDataRole.ToolTipRole):
            return self.fault(row, column) or None
        return column == SOURCE if role == MUTED_ROLE else None

    def _published_data(self, pair: Any, column: int, role: int) -> Any:
        own = self._replaced.get(frozenset((pair.a, pair.b)))
        if role == Qt.ItemDataRole.DisplayRole:
            text = typed_number(pair.k).replace("-", MINUS)
            source = pair.source if own is None else f"your value is used; {pair.source}"
            return (formula_text(pair.a), formula_text(pair.b), text, source)[column]
        if role in (Qt.ItemDataRole.EditRole, COPY_ROLE):
            return (pair.a, pair.b, typed_number(pair.k), pair.source)[column]
        if role == Qt.ItemDataRole.ToolTipRole:
            return f"{pair.source}. Type over the value to use your own."
        return (own is not None or column == SOURCE) if role == MUTED_ROLE else None

    def fault(self, row: int, column: int) -> str:
        """The sentence about a cell of one's own pair, "" when it is well."""
        if column == SOURCE:
            return ""
        found = self._session.faults_at(f"interactions[{row}].{FIELDS[column]}")
        return found[0].text if found else ""

    def setData(self, index: QModelIndex, value: Any, role: int = Qt.ItemDataRole.EditRole) -> bool:
        """Send a typed cell to the session."""
        if role != Qt.ItemDataRole.EditRole or not index.isValid() or index.column() == SOURCE:
            return False
        row, column, text = index.row(), index.column(), str(value).strip()
        if row > len(self._own):
            return self._type_over(self._published[row - len(self._own) - 1], text)
        if row == len(self._own) and not text:
            return False
        change = {FIELDS[column]: read_k(text) if column == K else text}
        old = self._own[row] if row < len(self._own) else None
        if old is not None and getattr(old, FIELDS[column]) == change[FIELDS[column]]:
            return False
        self._edit(row, FIELDS[column], change)
        return True

    def _type_over(self, pair: Any, text: str) -> bool:
        """A value typed over a published one makes the pair one's own."""
        keys = {pair.a, pair.b}
        at = next(
            (i for i, t in enumerate(self._own) if {_key(t.a), _key(t.b)} == keys), len(self._own)
        )
        k = read_k(text)
        if text == "" or (at == len(self._own) and k == pair.k):
            return False
        self._edit(at, "k", {"a": pair.a, "b": pair.b, "k": k})
        return True

    def _edit(self, row: int, part: str, changes: dict[str, Any]) -> None:
        case = edits.set_pair(self._session.case, row, **changes)
        self._session.edit_case(case, "type k_ij", f"interactions[{row}].{part}")

    def paste(self, row: int, cells: list[list[str]]) -> None:
        """Write pasted pairs over one's own from `row` on: species, species, value."""
        row = min(row, len(self._own))
        new = []
        for line in cells:
            a, b, k = (*line, "", "", "")[:3]
            if (a or b or k) and (a, b) != HEADERS[:2]:
                new.append(Interaction(a=a, b=b, k=read_k(k)))
        if new:
            label = f"paste {len(new)} k_ij" if len(new) > 1 else "paste k_ij"
            self._session.edit_case(edits.put_pairs(self._session.case, row, new), label)


def _key(text: str) -> str:
    """The key that a typed name or formula stands for, or the text."""
    import species_db

    try:
        return species_db.load().resolve(text.strip())
    except KeyError:
        return text


def read_k(text: str) -> float | str:
    """A typed value, or text that is kept for the solver to refuse."""
    try:
        return parse_number(text)
    except UnitError:
        return text


def _alignment(column: int) -> int:
    side = Qt.AlignmentFlag.AlignRight if column == K else Qt.AlignmentFlag.AlignLeft
    return int(side | Qt.AlignmentFlag.AlignVCenter)
