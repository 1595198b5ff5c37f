"""How cells are painted and edited."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import QEvent, QModelIndex, QObject, QRect, Qt, QTimer
from PySide6.QtGui import QColor, QFontMetrics, QKeyEvent, QPainter, QPen
from PySide6.QtWidgets import (
    QCompleter,
    QLineEdit,
    QStyle,
    QStyledItemDelegate,
    QStyleOptionViewItem,
    QWidget,
)

from gui.fields.quantity_field import LiveLine
from gui.fields.species_completer import PassOn, SpeciesCompleter
from gui.tables.stream_model import FAULT_ROLE
from gui.theme import Theme, mixed

MUTED_ROLE = Qt.ItemDataRole.UserRole + 3
BAR_ROLE = Qt.ItemDataRole.UserRole + 4
"""(share of the full width 0..1, QColor) of a bar."""
WARNING_ROLE = Qt.ItemDataRole.UserRole + 5
SECTION_ROLE = Qt.ItemDataRole.UserRole + 6
PAD = 4


class CellDelegate(QStyledItemDelegate):
    """Paints plain cells with the theme's colours: muted, faulty, section rows."""

    def __init__(self, theme: Theme, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.theme = theme

    def colour(self, index: QModelIndex) -> QColor:
        """The text colour of a cell."""
        t = self.theme.tokens
        if index.data(FAULT_ROLE):
            return QColor(t.error)
        if index.data(WARNING_ROLE):
            return QColor(t.warning)
        return QColor(t.muted if index.data(MUTED_ROLE) else t.text)

    def ground(self, painter: QPainter, option: QStyleOptionViewItem, index: QModelIndex) -> None:
        """The surface of a cell: selection, line beneath, mark of a fault."""
        t = self.theme.tokens
        if option.state & QStyle.StateFlag.State_Selected:
            painter.fillRect(option.rect, QColor(t.accent_wash))
        if not index.data(SECTION_ROLE):
            painter.setPen(QPen(QColor(t.faint)))
            painter.drawLine(option.rect.bottomLeft(), option.rect.bottomRight())
        if index.data(FAULT_ROLE):
            painter.setPen(QPen(QColor(t.error)))
            painter.drawRect(option.rect.adjusted(0, 0, -1, -1))
        elif option.state & QStyle.StateFlag.State_HasFocus:
            painter.setPen(QPen(QColor(t.accent)))
            painter.drawRect(option.rect.adjusted(0, 0, -1, -1))

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: QModelIndex) -> None:
        """Draw ground and text."""
        painter.save()
        self.ground(painter, option, index)
        self.text(painter, option, index)
        painter.restore()

    def text(self, painter: QPainter, option: QStyleOptionViewItem, index: QModelIndex) -> None:
        """Draw the text, cut at the end when there is no room."""
        text = index.data(Qt.ItemDataRole.DisplayRole)
        if not text:
            return
        font = option.font
        font.setBold(bool(index.data(SECTION_ROLE)))
        painter.setFont(font)
        painter.setPen(self.colour(index))
        rect = option.rect.adjusted(PAD, 0, -PAD, 0)
        align = index.data(Qt.ItemDataRole.TextAlignmentRole)
        flags = int(align) if align else int(Qt.AlignmentFlag.AlignVCenter)
        cut = QFontMetrics(font).elidedText(str(text), Qt.TextElideMode.ElideRight, rect.width())
        painter.drawText(rect, flags, cut)


class FigureDelegate(CellDelegate):
    """Aligns figures on the decimal point."""

    def __init__(
        self, theme: Theme, decimals: str = ".00000", parent: QObject | None = None
    ) -> None:
        super().__init__(theme, parent)
        self._room = decimals

    def text(self, painter: QPainter, option: QStyleOptionViewItem, index: QModelIndex) -> None:
        """Whole part to the left of the point's place, the rest to the right of it."""
        text = str(index.data(Qt.ItemDataRole.DisplayRole) or "")
        if not text:
            return
        metrics = QFontMetrics(option.font)
        painter.setFont(option.font)
        painter.setPen(self.colour(index))
        rect = option.rect.adjusted(PAD, 0, -PAD, 0)
        whole, point, rest = text.partition(".")
        if not point and "×" in text:
            whole, _, rest = text.partition(" ")
            rest = " " + rest
        after = point + rest
        # A power of ten needs more room than the decimals: it shifts left as far as it must.
        at = rect.right() - max(
            metrics.horizontalAdvance(self._room), metrics.horizontalAdvance(after)
        )
        middle = Qt.AlignmentFlag.AlignVCenter
        left = QRect(rect.left(), rect.top(), at - rect.left(), rect.height())
        painter.drawText(left, int(middle | Qt.AlignmentFlag.AlignRight), whole)
        right = QRect(at, rect.top(), rect.right() - at + PAD, rect.height())
        painter.drawText(right, int(middle | Qt.AlignmentFlag.AlignLeft), after)


class BarDelegate(CellDelegate):
    """A bar for a share; text where the bar would be too short to see."""

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: QModelIndex) -> None:
        """Draw the bar."""
        painter.save()
        self.ground(painter, option, index)
        bar = index.data(BAR_ROLE)
        if bar is not None:
            share, colour, muted = bar
            rect = option.rect.adjusted(PAD, 6, -PAD, -7)
            width = round(rect.width() * share)
            if share > 0 and not index.data(Qt.ItemDataRole.DisplayRole):
                width = max(width, 2)
            if width >= 2:
                t = self.theme.tokens
                fill = mixed(colour, t.panel, 0.6) if muted else colour
                painter.setPen(Qt.PenStyle.NoPen)
                painter.setBrush(fill)
                painter.setRenderHint(QPainter.RenderHint.Antialiasing)
                painter.drawRoundedRect(rect.x(), rect.y(), width, rect.height(), 1.5, 1.5)
        painter.restore()
        self.text_only(painter, option, index)

    def text_only(
        self, painter: QPainter, option: QStyleOptionViewItem, index: QModelIndex
    ) -> None:
        """What stands in the bar's place (section titles, "trace")."""
        if index.data(Qt.ItemDataRole.DisplayRole):
            painter.save()
            self.text(painter, option, index)
            painter.restore()


class EditDelegate(CellDelegate):
    """Opens a line; `live` sends each keystroke to the model, else Enter, Tab or leaving do."""

    def __init__(
        self,
        theme: Theme,
        live: bool = False,
        completer: Callable[[QObject], QCompleter] | None = None,
        done: Callable[[], None] | None = None,
        parent: QObject | None = None,
    ) -> None:
        super().__init__(theme, parent)
        self._live = live
        self._completer = completer
        self._done = done
        self._sending = False

    def createEditor(
        self, parent: QWidget, option: QStyleOptionViewItem, index: QModelIndex
    ) -> QWidget:
        """A line as large as the cell."""
        line = LiveLine(parent)
        line.setAlignment(Qt.AlignmentFlag(index.data(Qt.ItemDataRole.TextAlignmentRole) or 0x81))
        if self._completer is not None:
            completer = self._completer(line)
            if isinstance(completer, SpeciesCompleter):
                completer.attach(line)
            else:
                line.setCompleter(completer)
                PassOn(completer, line)
            # A click on an offer is the whole answer: it closes the cell as Enter does.
            completer.activated.connect(
                lambda _: QTimer.singleShot(0, line, lambda: self._take(line))
            )
        if self._live:
            line.textEdited.connect(lambda _: self.commitData.emit(line))
        return line

    def _take(self, line: QWidget) -> None:
        self.commitData.emit(line)
        self.closeEditor.emit(line, QStyledItemDelegate.EndEditHint.SubmitModelCache)

    def updateEditorGeometry(
        self, editor: QWidget, option: QStyleOptionViewItem, index: QModelIndex
    ) -> None:
        """The line covers the cell."""
        editor.setGeometry(option.rect)

    def setEditorData(self, editor: QWidget, index: QModelIndex) -> None:
        """Fill the line; what is being typed is overwritten by undo and redo alone."""
        text = str(index.data(Qt.ItemDataRole.EditRole) or "")
        if isinstance(editor, QLineEdit) and not self._sending:
            if editor.property("known") != text:
                editor.setText(text)
            editor.setProperty("known", text)

    def setModelData(self, editor: QWidget, model, index: QModelIndex) -> None:  # type: ignore[no-untyped-def]
        """Send the text."""
        if isinstance(editor, QLineEdit):
            self._sending = True
            try:
                model.setData(index, editor.text())
                editor.setProperty("known", str(index.data(Qt.ItemDataRole.EditRole) or ""))
            finally:
                self._sending = False

    def destroyEditor(self, editor: QWidget, index: QModelIndex) -> None:
        """The visit to the cell is over."""
        super().destroyEditor(editor, index)
        if self._done is not None:
            self._done()

    def eventFilter(self, editor: QObject, event: QEvent) -> bool:
        """Leave undo to the window; Escape closes as Enter does where typing is live."""
        if (
            self._live
            and isinstance(event, QKeyEvent)
            and event.type() == QEvent.Type.KeyPress
            and event.key() == Qt.Key.Key_Escape
            and isinstance(editor, QWidget)
        ):
            self.closeEditor.emit(editor, QStyledItemDelegate.EndEditHint.NoHint)
            return True
        return super().eventFilter(editor, event)
