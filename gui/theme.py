"""Colours, sizes and the style sheet: the one place that holds them."""

from __future__ import annotations

from dataclasses import dataclass

from PySide6.QtCore import QObject, Qt, Signal
from PySide6.QtGui import QColor, QFont, QPalette
from PySide6.QtWidgets import QApplication

from gui import style_sheet

GRID = 8
"""Pixels: distances are multiples of it."""
CARD_PADDING = 12
ROW_HEIGHT = 26


@dataclass(frozen=True, slots=True)
class Tokens:
    """The colours of one theme; text colours have a contrast of 4.5 or more on `panel`."""

    page: str
    panel: str
    line: str
    faint: str
    text: str
    muted: str
    accent: str
    accent_wash: str
    warning: str
    warning_wash: str
    error: str
    good: str
    good_wash: str
    dark: bool


LIGHT = Tokens(
    page="#F7F8F6",
    panel="#FFFFFF",
    line="#D9DED8",
    faint="#EDF0EC",
    text="#1C2321",
    muted="#5B6661",
    accent="#0B6E75",
    accent_wash="#DDEFEF",
    warning="#8A5200",
    warning_wash="#FBF0DC",
    error="#A3262A",
    good="#1F6B3A",
    good_wash="#E0F0E4",
    dark=False,
)
DARK = Tokens(
    page="#15191A",
    panel="#1D2324",
    line="#333C3D",
    faint="#272F30",
    text="#E6ECEA",
    muted="#9AA8A4",
    accent="#5CC2C7",
    accent_wash="#1F3B3D",
    warning="#F0B35A",
    warning_wash="#3A2F1C",
    error="#FF8A8A",
    good="#7CCB95",
    good_wash="#1F3527",
    dark=True,
)


SIZES = {"body": 1.0, "small": 0.87, "figure": 1.6}


def small_size() -> float:
    """The size of small text, in points."""
    return QApplication.font().pointSizeF() * SIZES["small"]


def sized(font: QFont, role: str) -> QFont:
    """`font` in one of the three sizes: 'body', 'small' or 'figure'; figures tabular."""
    base = QApplication.font().pointSizeF()
    out = QFont(font)
    out.setPointSizeF(base * SIZES[role])
    out.setFeature(QFont.Tag("tnum"), 1)
    return out


class Theme(QObject):
    """The theme in use; follows the system unless the user chose one."""

    changed = Signal()

    def __init__(self, app: QApplication, choice: str = "system") -> None:
        super().__init__()
        self._app = app
        self.choice = choice
        self.tokens = LIGHT
        if app.style().name() != "fusion":
            app.setStyle("Fusion")
        # Nine points is Qt's fall-back where the desktop says nothing; too small to read for hours.
        if app.font().pointSizeF() < 9.8:
            font = app.font()
            font.setPointSizeF(9.8)
            app.setFont(font)
        app.styleHints().colorSchemeChanged.connect(self._follow)
        self._apply()

    def choose(self, choice: str) -> None:
        """Use 'system', 'light' or 'dark'."""
        self.choice = choice
        self._apply()

    def close(self) -> None:
        """Stop following the system."""
        self._app.styleHints().colorSchemeChanged.disconnect(self._follow)

    def _follow(self) -> None:
        if self.choice == "system":
            self._apply()

    def _apply(self) -> None:
        system_dark = self._app.styleHints().colorScheme() == Qt.ColorScheme.Dark
        dark = self.choice == "dark" or (self.choice == "system" and system_dark)
        self.tokens = DARK if dark else LIGHT
        sheet = style_sheet.text(self.tokens)
        if sheet != self._app.styleSheet():  # restyling every widget takes its time
            self._app.setPalette(palette(self.tokens))
            self._app.setStyleSheet(sheet)
        self.changed.emit()


def palette(t: Tokens) -> QPalette:
    """The Qt palette of a theme."""
    role = QPalette.ColorRole
    out = QPalette()
    for which, colour in (
        (role.Window, t.page),
        (role.Base, t.panel),
        (role.AlternateBase, t.faint),
        (role.Button, t.panel),
        (role.WindowText, t.text),
        (role.Text, t.text),
        (role.ButtonText, t.text),
        (role.ToolTipBase, t.panel),
        (role.ToolTipText, t.text),
        (role.PlaceholderText, t.muted),
        (role.Highlight, t.accent_wash),
        (role.HighlightedText, t.text),
        (role.Accent, t.accent),
        (role.Link, t.accent),
        (role.Mid, t.line),
        (role.Dark, t.line),
        (role.Light, t.panel),
    ):
        out.setColor(which, QColor(colour))
    for which in (role.WindowText, role.Text, role.ButtonText):
        out.setColor(QPalette.ColorGroup.Disabled, which, mixed(t.muted, t.panel, 0.45))
    return out


def mixed(colour: str | QColor, other: str | QColor, share: float) -> QColor:
    """`colour` with `share` (0 to 1) of `other` in it."""
    a, b = QColor(colour), QColor(other)
    return QColor(
        *(
            round(x + (y - x) * share)
            for x, y in zip(
                (a.red(), a.green(), a.blue()), (b.red(), b.green(), b.blue()), strict=True
            )
        )
    )


def contrast(a: str | QColor, b: str | QColor) -> float:
    """Contrast ratio of two colours, 1 to 21 (WCAG 2.1, relative luminance of sRGB)."""

    def luminance(colour: str | QColor) -> float:
        parts = [
            v / 12.92 if v <= 0.04045 else ((v + 0.055) / 1.055) ** 2.4
            for v in QColor(colour).getRgbF()[:3]
        ]
        return 0.2126 * parts[0] + 0.7152 * parts[1] + 0.0722 * parts[2]

    high, low = sorted((luminance(a), luminance(b)), reverse=True)
    return (high + 0.05) / (low + 0.05)


def readable(colour: str | QColor, t: Tokens, least: float = 4.5) -> QColor:
    """`colour`, moved towards the theme's text until it stands out from the panel by `least`."""
    out = QColor(colour)
    for step in range(1, 21):
        if contrast(out, t.panel) >= least:
            break
        out = mixed(colour, t.text, step / 20)
    return out
