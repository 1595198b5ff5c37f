"""The rows of one stream: species, amount, unit and what share that is."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, Qt, Signal

from gui import edits
from gui.session import Session
from gui.tables.clipboard import COPY_ROLE
from solver.project.model import Amount
from solver.project.units import UnitError, parse_number
from solver.project.wording import formula_text, number_text, typed_number, unit_text

SPECIES, AMOUNT, UNIT, SHARE = range(4)
HEADERS = ("species", "amount", "unit", "mol %")
FIELDS = ("species", "value", "unit")
FAULT_ROLE = Qt.ItemDataRole.UserRole + 2
_Index = QModelIndex
_TOP = QModelIndex()


class StreamModel(QAbstractTableModel):
    """Reads one stream of the session's case and sends every change back as an edit.

    The last row is always empty: typing in it makes a new one.
    """

    refused = Signal(str)

    def __init__(self, session: Session, stream: int, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._session = session
        self.stream = stream
        self._amounts: tuple[Amount, ...] = self._read()
        self._shares: tuple[float | None, ...] = ()

    def _read(self) -> tuple[Amount, ...]:
        streams = self._session.case.streams
        return streams[self.stream].amounts if self.stream < len(streams) else ()

    def refresh(self) -> None:
        """Follow the session, without resetting an open editor's row."""
        new, old = self._read(), self._amounts
        more = len(new) - len(old)
        if more > 0:
            # Rows come after the empty one, which then is filled: an editor in it stays open.
            self.beginInsertRows(_TOP, len(old) + 1, len(new))
            self._amounts = (*old, *(Amount(species="", value="", unit=""),) * more)
            self.endInsertRows()
        elif more < 0:
            same = next(
                (i for i, (a, b) in enumerate(zip(old, new, strict=False)) if a != b), len(new)
            )
            self.beginRemoveRows(_TOP, same, same - more - 1)
            self._amounts = (*old[:same], *old[same - more :])
            self.endRemoveRows()
        self._amounts = new
        self.changed()

    def set_shares(self, shares: tuple[float | None, ...]) -> None:
        """Mole fractions of the rows within the stream (None: unknown)."""
        if shares != self._shares:
            self._shares = shares
            self.changed()

    def changed(self) -> None:
        """Values or faults may have changed; rows are the same."""
        self.dataChanged.emit(self.index(0, 0), self.index(self.rowCount() - 1, SHARE))

    def rowCount(self, parent: _Index = _TOP) -> int:
        """All rows and the empty one."""
        return 0 if parent.isValid() else len(self._amounts) + 1

    def columnCount(self, parent: _Index = _TOP) -> int:
        """Species, amount, unit, share."""
        return 0 if parent.isValid() else len(HEADERS)

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = 0) -> Any:
        """Column titles."""
        if orientation != Qt.Orientation.Horizontal:
            return None
        if role == Qt.ItemDataRole.DisplayRole:
            return HEADERS[section]
        if role == Qt.ItemDataRole.TextAlignmentRole:
            side = (
                Qt.AlignmentFlag.AlignRight
                if section in (AMOUNT, SHARE)
                else Qt.AlignmentFlag.AlignLeft
            )
            return int(side | Qt.AlignmentFlag.AlignVCenter)
        return None

    def flags(self, index: _Index) -> Qt.ItemFlag:
        """All but the share are editable."""
        if not index.isValid():
            return Qt.ItemFlag.NoItemFlags
        flags = Qt.ItemFlag.ItemIsSelectable | Qt.ItemFlag.ItemIsEnabled
        if index.column() != SHARE:
            flags |= Qt.ItemFlag.ItemIsEditable
        return flags

    def data(self, index: _Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        """Text, full values, alignment and faults of a cell."""
        if not index.isValid():
            return None
        row, column = index.row(), index.column()
        if role == Qt.ItemDataRole.TextAlignmentRole:
            side = (
                Qt.AlignmentFlag.AlignRight
                if column in (AMOUNT, SHARE)
                else Qt.AlignmentFlag.AlignLeft
            )
            return int(side | Qt.AlignmentFlag.AlignVCenter)
        if row == len(self._amounts):
            texts = (Qt.ItemDataRole.EditRole, Qt.ItemDataRole.DisplayRole)
            return "" if role in texts and column != SHARE else None
        if role in (Qt.ItemDataRole.DisplayRole, Qt.ItemDataRole.EditRole, COPY_ROLE):
            return self._text(self._amounts[row], row, column, role)
        if role in (FAULT_ROLE, Qt.ItemDataRole.ToolTipRole):
            fault = self.fault(row, column)
            return fault or (None if role == FAULT_ROLE else self._hint(row, column))
        return None

    def _text(self, amount: Amount, row: int, column: int, role: int) -> Any:
        shown = role == Qt.ItemDataRole.DisplayRole
        if column == SPECIES:
            typed = amount.species
            return formula_text(typed) if shown and is_key(typed) else typed
        if column == AMOUNT:
            return typed_number(amount.value)
        if column == UNIT:
            return unit_text(amount.unit) if shown else amount.unit
        share = self._shares[row] if row < len(self._shares) else None
        if share is None:
            return None
        return number_text(100 * share) if shown else 100 * share

    def _hint(self, row: int, column: int) -> str | None:
        share = self._shares[row] if row < len(self._shares) else None
        return f"{100 * share!r} mol %" if column == SHARE and share is not None else None

    def fault(self, row: int, column: int) -> str:
        """The sentence about a cell, "" when it is well."""
        path = f"streams[{self.stream}].amounts[{row}]"
        found = self._session.faults_at(path)
        for fault in found:
            if column < SHARE and fault.field in (path, f"{path}.{FIELDS[column]}"):
                return fault.text
        return ""

    def setData(self, index: _Index, value: Any, role: int = Qt.ItemDataRole.EditRole) -> bool:
        """Send a typed cell to the session."""
        row, column, text = index.row(), index.column(), str(value).strip()
        if role != Qt.ItemDataRole.EditRole or not index.isValid() or column == SHARE:
            return False
        if row == len(self._amounts) and not text:
            return False
        old = self._amounts[row] if row < len(self._amounts) else None
        changes = self._changes(column, text)
        if old is not None and all(getattr(old, k) == v for k, v in changes.items()):
            return False
        label = f"type {HEADERS[column]}"
        case = edits.set_amount(self._session.case, self.stream, row, **changes)
        field = f"streams[{self.stream}].amounts[{row}].{FIELDS[column]}"
        self._session.edit_case(case, label, field)
        return True

    def _changes(self, column: int, text: str) -> dict[str, Any]:
        if column == AMOUNT:
            return read_amount(text)
        if column == UNIT:
            return {"unit": read_unit(text)}
        return {"species": text}

    def paste(self, row: int, column: int, cells: list[list[str]]) -> None:
        """Write pasted cells over the rows from `row` on; what is no number stays as text."""
        old = self._amounts
        new: list[Amount] = []
        unit = edits.unit_of_next_row(self._session.case.streams[self.stream])
        for i, line in enumerate(cells):
            at = row + i
            amount = old[at] if at < len(old) else Amount(species="", value="", unit=unit)
            changes: dict[str, Any] = {}
            for offset, text in enumerate(line):
                if column + offset < SHARE:
                    changes |= self._changes(column + offset, text)
            if not any(line):
                continue
            amount = amount.model_copy(update=changes)
            unit = amount.unit
            new.append(amount)
        if new:
            case = edits.put_amounts(self._session.case, self.stream, row, new)
            self._session.edit_case(case, f"paste {len(new)} rows" if len(new) > 1 else "paste")


def is_key(text: str) -> bool:
    """Whether a typed text reads as a formula."""
    return text[:1].isupper() and " " not in text.partition("(")[0]


def read_amount(text: str) -> dict[str, Any]:
    """A typed amount: "12", "12 kg/h", or text that is kept for the solver to refuse."""
    from gui.fields.reading import read_quantity

    if not text:
        return {"value": ""}
    try:
        return {"value": parse_number(text)}
    except UnitError:
        pass
    quantity = read_quantity(text, "feed", "")
    if isinstance(quantity.value, str) or not quantity.unit:
        return {"value": text}
    return {"value": quantity.value, "unit": quantity.unit}


def read_unit(text: str) -> str:
    """A typed unit in the table's spelling, or as typed when it is none."""
    from solver.project import units

    try:
        return units.canonical(text, "feed")
    except UnitError:
        return text
