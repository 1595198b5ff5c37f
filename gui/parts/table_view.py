"""The look shared by the read-only tables of the answer."""

from __future__ import annotations

from PySide6.QtCore import QAbstractItemModel, Qt
from PySide6.QtWidgets import QAbstractItemView, QHeaderView, QWidget

from gui.tables.clipboard import CopyView
from gui.theme import ROW_HEIGHT


def plain_table(model: QAbstractItemModel, name: str, parent: QWidget | None = None) -> CopyView:
    """A table without grid or row numbers, rows as high as a line of text allows."""
    view = CopyView(parent)
    view.setModel(model)
    view.setAccessibleName(name)
    view.setShowGrid(False)
    view.setTabKeyNavigation(False)
    view.setWordWrap(False)
    view.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
    view.setHorizontalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
    view.setVerticalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
    view.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
    view.verticalHeader().hide()
    view.verticalHeader().setDefaultSectionSize(ROW_HEIGHT)
    header = view.horizontalHeader()
    header.setHighlightSections(False)
    header.setSectionsClickable(False)
    header.setFixedHeight(24)
    header.setSectionResizeMode(QHeaderView.ResizeMode.Fixed)
    return view
