"""The table of the composition with its bars."""

from __future__ import annotations

from PySide6.QtWidgets import QHeaderView, QVBoxLayout, QWidget

from gui.colours import SpeciesColours
from gui.parts.table_view import plain_table
from gui.readings import Units
from gui.tables import composition_model as columns
from gui.tables.composition_model import CompositionModel
from gui.tables.delegates import BarDelegate, CellDelegate, FigureDelegate
from gui.theme import Theme


class CompositionView(QWidget):
    """Species, bar, mol %, amount and mass %."""

    def __init__(self, theme: Theme, colours: SpeciesColours) -> None:
        super().__init__()
        self.model = CompositionModel(theme, colours, self)
        self.table = plain_table(self.model, "composition at the end", self)
        cells = CellDelegate(theme, self)
        self.table.setItemDelegate(cells)
        self._bars = BarDelegate(theme, self)
        self._figures = FigureDelegate(theme, parent=self)
        self.table.setItemDelegateForColumn(columns.BAR, self._bars)
        for column in (columns.SHARE, columns.AMOUNT, columns.MASS):
            self.table.setItemDelegateForColumn(column, self._figures)
            self.table.setColumnWidth(column, 106)
        header = self.table.horizontalHeader()
        self.table.setColumnWidth(columns.SPECIES, 108)
        self.table.setColumnWidth(columns.NAME, 196)
        header.setSectionResizeMode(columns.BAR, QHeaderView.ResizeMode.Stretch)
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.addWidget(self.table)
        theme.changed.connect(self.model.repaint)
        self.model.modelReset.connect(self._span)

    def _span(self) -> None:
        """Section titles run across the table."""
        self.table.clearSpans()
        for i, row in enumerate(self.model.rows):
            if isinstance(row, str):
                self.table.setSpan(i, 0, 1, columns.MASS + 1)

    def show_end(self, end, units: Units, stale: bool) -> None:  # type: ignore[no-untyped-def]
        """Show an end state."""
        self.model.show(end, units)
        self.model.set_stale(stale)
