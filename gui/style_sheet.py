"""The style sheet of a theme: flat surfaces, one-pixel lines, no shadows."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from gui.theme import Tokens

_TEMPLATE = """
QWidget#page, QMainWindow { background: {page}; }
QWidget#header { background: {panel}; border: 0; border-bottom: 1px solid {line}; }
QFrame#card { background: {panel}; border: 1px solid {line}; border-radius: 3px; }
QFrame#rule { background: {line}; border: 0; max-height: 1px; min-height: 1px; }
QScrollArea, QScrollArea > QWidget > QWidget { background: transparent; border: 0; }
QLabel { background: transparent; }
QLabel[role="title"] { font-weight: 600; }
QLabel[role="muted"] { color: {muted}; }
QLabel[role="fault"] { color: {error}; }
QLabel[role="warning"] { color: {warning}; }
QLabel[role="good"] { color: {good}; }
QLabel[stale="true"] { color: {stale}; }

QAbstractItemView#offers { background: {panel}; border: 1px solid {line}; outline: 0;
            selection-background-color: {accent_wash}; selection-color: {text}; }
QAbstractItemView#offers::item { padding: 3px 6px; }

QToolTip { background: {panel}; color: {text}; border: 1px solid {line}; padding: 4px; }

QLineEdit { background: {panel}; border: 1px solid {line}; border-radius: 3px;
            padding: 3px 7px; selection-background-color: {accent_wash};
            selection-color: {text}; }
QLineEdit:hover { border-color: {muted}; }
QLineEdit:focus { border: 1px solid {accent}; }
QLineEdit[faulty="true"] { border: 1px solid {error}; }
QLineEdit[flat="true"] { border-color: transparent; background: transparent; padding: 3px 4px; }
QLineEdit[flat="true"]:hover { border-color: {line}; }
QLineEdit[flat="true"]:focus { border-color: {accent}; background: {panel}; }
QLineEdit[flat="true"][faulty="true"] { border-color: {error}; }
QLineEdit[heading="true"] { color: {accent}; font-weight: 600; padding-left: 3px; }
QAbstractItemView QLineEdit { padding: 0 3px; border-radius: 0; }

QComboBox { background: {panel}; border: 1px solid {line}; border-radius: 3px;
            padding: 4px 8px; }
QComboBox:hover { border-color: {muted}; }
QComboBox:focus { border-color: {accent}; }
QComboBox[faulty="true"] { border-color: {error}; }
QComboBox QAbstractItemView { background: {panel}; border: 1px solid {line}; outline: 0;
            selection-background-color: {accent_wash}; selection-color: {text}; }
QComboBox::drop-down { border: 0; width: 24px; }
QComboBox::down-arrow { image: url({chevron}); width: 10px; height: 6px; }

QToolButton { background: transparent; border: 1px solid transparent; border-radius: 3px;
              padding: 4px 8px; color: {text}; }
QToolButton:hover { background: {faint}; }
QToolButton:pressed { background: {accent_wash}; }
QToolButton:focus { border-color: {accent}; }
QToolButton:disabled { color: {stale}; }
QToolButton::menu-indicator { image: none; }
QToolButton[muted="true"] { color: {muted}; }
QToolButton[link="true"] { color: {accent}; padding: 3px 4px; }
QToolButton[choice="true"] { color: {muted}; padding: 3px 7px; }
QToolButton[choice="true"]:checked { color: {accent}; font-weight: 600; }
QToolButton[chip="true"] { border: 1px solid {line}; color: {muted}; padding: 3px 8px;
              min-width: 14px; font-weight: 600; }
QToolButton[chip="true"]:checked { background: {accent_wash}; border-color: {accent};
              color: {accent}; }
QToolButton[pill="good"] { background: {good_wash}; color: {good}; border-radius: 10px;
              padding: 3px 14px; border: 1px solid transparent; }
QToolButton[pill="wait"] { background: {faint}; color: {muted}; border-radius: 10px;
              padding: 3px 14px; border: 1px solid transparent; }
QToolButton[pill="fault"] { background: {warning_wash}; color: {warning}; border-radius: 10px;
              padding: 3px 14px; border: 1px solid transparent; }
QToolButton[pill]:focus { border-color: {accent}; }

QPushButton { background: {panel}; border: 1px solid {line}; border-radius: 3px;
              padding: 5px 14px; }
QPushButton:hover { border-color: {muted}; }
QPushButton:focus, QPushButton:default { border-color: {accent}; }

QDialogButtonBox, QMessageBox { dialogbuttonbox-buttons-have-icons: 0; }

QMenu { background: {panel}; border: 1px solid {line}; padding: 4px 0; }
QMenu::item { padding: 5px 28px 5px 20px; }
QMenu::item:selected { background: {accent_wash}; color: {text}; }
QMenu::item:disabled { color: {stale}; }
QMenu::separator { height: 1px; background: {line}; margin: 4px 0; }

QTableView { background: transparent; border: 0; outline: 0; gridline-color: {faint};
             selection-background-color: {accent_wash}; selection-color: {text}; }
QAbstractScrollArea::corner { background: transparent; border: 0; }
QTableView::item { padding: 0 4px; border: 0; }
QHeaderView { background: transparent; border: 0; }
QHeaderView::section { background: {panel}; color: {muted}; border: 0;
             border-bottom: 1px solid {line}; padding: 2px 4px; font-weight: 400;
             font-size: {small}pt; }

QTabBar { background: transparent; border: 0; qproperty-drawBase: 0; }
QTabBar::tab { background: transparent; border: 0; border-bottom: 2px solid transparent;
             padding: 4px 2px 5px 2px; margin-right: 16px; color: {muted}; }
QTabBar::tab:selected { color: {accent}; border-bottom-color: {accent}; font-weight: 600; }
QTabBar::tab:focus { color: {accent}; }

QProgressBar { background: transparent; border: 0; max-height: 2px; min-height: 2px; }
QProgressBar::chunk { background: {accent}; }
QSplitter::handle { background: transparent; }
QScrollBar:vertical { background: transparent; width: 8px; margin: 0; }
QScrollBar:horizontal { background: transparent; height: 8px; margin: 0; }
QScrollBar::handle { background: {line}; border-radius: 3px; min-height: 24px; min-width: 24px; }
QScrollBar::handle:hover { background: {muted}; }
QScrollBar::add-line, QScrollBar::sub-line { width: 0; height: 0; }
QScrollBar::add-page, QScrollBar::sub-page { background: transparent; }

QFrame#notice { background: {faint}; border: 1px solid {muted}; border-radius: 3px; }
QFrame#notice[level="warning"] { background: {warning_wash}; }
QPlainTextEdit { background: {panel}; border: 1px solid {line}; border-radius: 3px;
            padding: 1px 3px; selection-background-color: {accent_wash};
            selection-color: {text}; }
QPlainTextEdit:focus { border-color: {accent}; }
QPlainTextEdit[faulty="true"] { border-color: {error}; }
"""


def text(tokens: Tokens) -> str:
    """The style sheet of `tokens`."""
    from gui.icons import chevron
    from gui.theme import mixed, small_size

    out = _TEMPLATE
    for name in tokens.__dataclass_fields__:
        out = out.replace("{" + name + "}", str(getattr(tokens, name)))
    out = out.replace("{small}", f"{small_size():.2f}")
    out = out.replace("{stale}", mixed(tokens.muted, tokens.panel, 0.4).name())
    return out.replace("{chevron}", chevron(tokens.dark))
