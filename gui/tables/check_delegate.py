"""Paints a check mark in the accent colour beside a species."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QModelIndex, QPointF, QRect, Qt
from PySide6.QtGui import QColor, QMouseEvent, QPainter, QPen, QPolygonF
from PySide6.QtWidgets import QStyleOptionViewItem

from gui.tables.delegates import PAD, CellDelegate

_BOX = 14


class CheckDelegate(CellDelegate):
    """Cells with a check state get a box; a click anywhere in the first column toggles it."""

    def text(self, painter: QPainter, option: QStyleOptionViewItem, index: QModelIndex) -> None:
        """Box, mark, then the text moved to the right."""
        state = index.data(Qt.ItemDataRole.CheckStateRole)
        if state is None:
            self._name_and_remark(painter, option, index)
            return
        t = self.theme.tokens
        on = state == Qt.CheckState.Checked
        top = option.rect.top() + (option.rect.height() - _BOX) // 2
        box = QRect(option.rect.left() + 2, top, _BOX, _BOX)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setPen(QPen(QColor(t.accent if on else t.muted), 1))
        painter.setBrush(QColor(t.accent) if on else Qt.BrushStyle.NoBrush)
        painter.drawRoundedRect(box, 2, 2)
        if on:
            x, y = box.x(), box.y()
            mark = [QPointF(x + 3.5, y + 7.2), QPointF(x + 6, y + 10), QPointF(x + 10.7, y + 4.3)]
            painter.setPen(QPen(QColor(t.panel), 1.7))
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawPolyline(QPolygonF(mark))
        moved = QStyleOptionViewItem(option)
        moved.rect = option.rect.adjusted(_BOX + 6, 0, 0, 0)
        super().text(painter, moved, index)

    def _name_and_remark(
        self, painter: QPainter, option: QStyleOptionViewItem, index: QModelIndex
    ) -> None:
        """The name takes the room that its own remark leaves."""
        name = QStyleOptionViewItem(option)
        remark = index.siblingAtColumn(2)
        if remark.data():
            super().text(painter, option, remark)
            taken = option.fontMetrics.horizontalAdvance(remark.data()) + 3 * PAD
            name.rect = option.rect.adjusted(0, 0, -taken, 0)
        super().text(painter, name, index)

    def editorEvent(self, event, model, option, index) -> bool:  # type: ignore[no-untyped-def]
        """Toggle on release of the left button."""
        state = index.data(Qt.ItemDataRole.CheckStateRole)
        if state is None or not isinstance(event, QMouseEvent):
            return False
        if event.button() != Qt.MouseButton.LeftButton:
            return False
        if event.type() == QEvent.Type.MouseButtonRelease:
            on = state == Qt.CheckState.Checked
            new = Qt.CheckState.Unchecked if on else Qt.CheckState.Checked
            model.setData(index, new, Qt.ItemDataRole.CheckStateRole)
            return True
        return False
