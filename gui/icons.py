"""The program's own drawings."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import QByteArray, QSize, Qt
from PySide6.QtGui import QIcon, QPainter, QPixmap
from PySide6.QtSvg import QSvgRenderer

_HERE = Path(__file__).parent


def chevron(dark: bool) -> str:
    """Path of the small downward arrow, as a style sheet wants it."""
    return (_HERE / f"chevron-{'dark' if dark else 'light'}.svg").as_posix()


def valley(colour: str, size: int) -> QPixmap:
    """The mark: a valley curve with one dot at its lowest point, `size` pixels square."""
    svg = (_HERE / "icon.svg").read_text(encoding="utf-8").replace("#0B6E75", colour)
    ratio = 2
    picture = QPixmap(QSize(size, size) * ratio)
    picture.fill(Qt.GlobalColor.transparent)
    painter = QPainter(picture)
    QSvgRenderer(QByteArray(svg.encode())).render(painter)
    painter.end()
    picture.setDevicePixelRatio(ratio)
    return picture


def program_icon() -> QIcon:
    """The window's icon."""
    return QIcon(str(_HERE / "icon.svg"))
