"""The table of actions: what each is called, its key, and where it stands in the menu."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from PySide6.QtGui import QAction, QKeySequence
from PySide6.QtWidgets import QWidget


@dataclass(frozen=True, slots=True)
class ActionRow:
    """One action; the first of several keys is the one shown."""

    name: str
    words: str
    keys: tuple[str, ...]
    section: str


ACTIONS = (
    ActionRow("new", "New", ("Ctrl+N",), "Project"),
    ActionRow("open", "Open …", ("Ctrl+O",), "Project"),
    ActionRow("recent", "Open recent", ("Ctrl+Shift+O",), "Project"),
    ActionRow("save", "Save", ("Ctrl+S",), "Project"),
    ActionRow("save_as", "Save as …", ("Ctrl+Shift+S",), "Project"),
    ActionRow("notes", "Title and notes …", ("Ctrl+I",), "Project"),
    ActionRow("quit", "Quit", ("Ctrl+Q",), "Project"),
    ActionRow("undo", "Undo", ("Ctrl+Z",), "Edit"),
    ActionRow("redo", "Redo", ("Ctrl+Shift+Z", "Ctrl+Y"), "Edit"),
    ActionRow("copy_view", "Copy the view of the end state", ("Ctrl+Shift+C",), "Edit"),
    ActionRow("add_stream", "Add a stream", ("Ctrl+Shift+A",), "Input"),
    ActionRow("remove_stream", "Remove the stream", ("Ctrl+Shift+R",), "Input"),
    ActionRow("stream_up", "Move the stream up", ("Alt+Shift+Up",), "Input"),
    ActionRow("stream_down", "Move the stream down", ("Alt+Shift+Down",), "Input"),
    ActionRow("add_restriction", "Add a restriction", ("Ctrl+Shift+H",), "Input"),
    ActionRow("add_case", "Add a case", ("Ctrl+Shift+N",), "Case"),
    ActionRow("duplicate_case", "Duplicate the case", ("Ctrl+D",), "Case"),
    ActionRow("rename_case", "Rename the case …", ("Ctrl+R",), "Case"),
    ActionRow("delete_case", "Delete the case", ("Ctrl+Shift+Del",), "Case"),
    ActionRow("next_case", "Next case", ("Ctrl+PgDown",), "Case"),
    ActionRow("previous_case", "Previous case", ("Ctrl+PgUp",), "Case"),
    ActionRow("go_in", "Go to Going in", ("Alt+1",), "View"),
    ActionRow("go_fixed", "Go to Held fixed", ("Alt+2",), "View"),
    ActionRow("go_form", "Go to May form", ("Alt+3",), "View"),
    ActionRow("go_end", "Go to Where it ends up", ("Alt+4",), "View"),
    ActionRow("go_what_if", "Go to What if", ("Alt+5",), "View"),
    ActionRow("tab_composition", "Composition", ("Ctrl+1",), "View"),
    ActionRow("tab_phases", "Phases", ("Ctrl+2",), "View"),
    ActionRow("tab_reactions", "Reactions", ("Ctrl+3",), "View"),
    ActionRow("tab_energy", "Energy", ("Ctrl+4",), "View"),
    ActionRow("tab_proof", "Proof", ("Ctrl+5",), "View"),
    ActionRow("tab_gas", "Gas model", ("Ctrl+6",), "View"),
    ActionRow("log_plot", "Logarithmic plot", ("Ctrl+L",), "View"),
    ActionRow("log_bars", "Logarithmic bars", ("Ctrl+Shift+L",), "View"),
    ActionRow("theme", "Light, dark or as the system", ("Ctrl+Shift+T",), "View"),
    ActionRow("stop", "Stop computing", ("Esc",), "View"),
    ActionRow("menu", "Menu", ("F10",), "View"),
    ActionRow("keys", "Keyboard", ("F1",), "Help"),
    ActionRow("about", "About Thalweg", ("Shift+F1",), "Help"),
)
SECTIONS = ("Project", "Edit", "Input", "Case", "View", "Help")

TABLE_KEYS = (
    ("In a table: edit the cell", "Enter or type"),
    ("In a table: remove rows", "Del"),
    ("In a table: insert a row", "Ins"),
    ("In a table: move the row", "Alt+Up, Alt+Down"),
    ("In a table: copy, paste", "Ctrl+C, Ctrl+V"),
    ("In the candidates: allow or exclude", "Space"),
    ("In the plot: read out", "Left, Right"),
)


def build(window: QWidget, callbacks: dict[str, Callable[[], object]]) -> dict[str, QAction]:
    """A QAction for each row, with its keys, connected to the callback of its name."""
    out = {}
    for row in ACTIONS:
        action = QAction(row.words, window)
        action.setShortcuts([QKeySequence(k) for k in row.keys])
        action.triggered.connect(lambda _=False, call=callbacks[row.name]: call())
        window.addAction(action)
        out[row.name] = action
    return out


def key_list() -> list[tuple[str, str]]:
    """Every action and its keys, in the system's spelling."""
    native = QKeySequence.SequenceFormat.NativeText
    rows = [
        (
            row.words.removesuffix(" …"),
            ", ".join(QKeySequence(k).toString(native) for k in row.keys),
        )
        for row in ACTIONS
    ]
    return rows + list(TABLE_KEYS)
