"""Places the panels and connects them; nothing else."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import Qt, QTimer
from PySide6.QtGui import QCloseEvent, QDragEnterEvent, QDropEvent, QShowEvent
from PySide6.QtWidgets import (
    QApplication,
    QHBoxLayout,
    QInputDialog,
    QMainWindow,
    QMenu,
    QScrollArea,
    QSplitter,
    QVBoxLayout,
    QWidget,
)

from gui import actions, edits, icons
from gui.dialogs.notes import NotesDialog
from gui.dialogs.report import AboutDialog, BugReport, KeysDialog
from gui.files import Files
from gui.panels.ends_up import TABS, EndsUp
from gui.panels.going_in import GoingIn
from gui.panels.header import Header
from gui.panels.held_fixed import HeldFixed
from gui.panels.may_form import MayForm
from gui.panels.notice import Notice
from gui.panels.what_if import WhatIf
from gui.preferences import Preferences
from gui.session import Session
from gui.theme import GRID, Theme

LEFT_WIDTH = 412


class Window(QMainWindow):
    """The one window: what goes in at the left, where it ends up at the right."""

    def __init__(self, session: Session, theme: Theme, preferences: Preferences) -> None:
        super().__init__()
        self.session = session
        self.theme = theme
        self.preferences = preferences
        self.files = Files(session, preferences, self)
        self.setWindowIcon(icons.program_icon())
        self.setAcceptDrops(True)
        self.setMinimumSize(1000, 620)
        self._painted = False
        self.going_in = GoingIn(session, theme)
        self.held_fixed = HeldFixed(session)
        self.may_form = MayForm(session, theme)
        self.ends_up = EndsUp(session, theme)
        self.what_if = WhatIf(session, theme)
        self.actions_by_name = actions.build(self, self._callbacks())
        self.header = Header(session, theme, self.actions_by_name)
        self._place()
        self._connect()
        self._retitle()
        self._follow_stack()
        if preferences.geometry is not None:
            self.restoreGeometry(preferences.geometry)
        else:
            room = self.screen().availableSize()
            self.resize(min(1440, room.width()), min(900, room.height()))

    def _place(self) -> None:
        page = QWidget()
        self.notice = Notice(page)
        page.setObjectName("page")
        outer = QVBoxLayout(page)
        outer.setContentsMargins(0, 0, 0, 0)
        outer.setSpacing(0)
        outer.addWidget(self.header)
        below = QHBoxLayout()
        below.setContentsMargins(GRID * 2, GRID * 2, GRID * 2, GRID * 2)
        below.setSpacing(GRID)
        inner = QWidget()
        inner.setFixedWidth(LEFT_WIDTH)
        column = QVBoxLayout(inner)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(GRID * 2)
        self.going_in.setMinimumHeight(184)
        column.addWidget(self.going_in, 5)
        column.addWidget(self.held_fixed, 0)
        column.addWidget(self.may_form, 4)
        # Where the screen is too low for all that is typed in, it is scrolled, not squeezed.
        left = QScrollArea()
        left.setWidgetResizable(True)
        left.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        left.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        left.setFixedWidth(LEFT_WIDTH + GRID)
        left.setWidget(inner)
        self.right = QSplitter(Qt.Orientation.Vertical)
        self.right.setHandleWidth(GRID * 2)
        self.right.setChildrenCollapsible(False)
        self.right.addWidget(self.ends_up)
        self.right.addWidget(self.what_if)
        self.right.setStretchFactor(0, 55)
        self.right.setStretchFactor(1, 45)
        below.addWidget(left)
        below.addWidget(self.right, 1)
        outer.addLayout(below, 1)
        self.setCentralWidget(page)

    def _connect(self) -> None:
        session = self.session
        session.messages.told.connect(self.notice.tell)
        session.messages.bug.connect(lambda _: self.files.recovery.keep())
        session.messages.bug.connect(self._show_bug)
        session.file_changed.connect(self._retitle)
        session.document_changed.connect(self._retitle)
        stack = session.undo_stack
        stack.indexChanged.connect(lambda _: self._follow_stack())
        self.header.recent.aboutToShow.connect(lambda: self._fill_recent(self.header.recent))
        self.ends_up.copy_button.clicked.connect(self.copy_view)
        self.held_fixed.gas.details.clicked.connect(self.actions_by_name["tab_gas"].trigger)

    def _callbacks(self):  # type: ignore[no-untyped-def]
        session, files = self.session, self.files
        return {
            "new": files.new,
            "open": files.open,
            "recent": self.popup_recent,
            "save": files.save,
            "save_as": files.save_as,
            "quit": self.close,
            "undo": session.undo_stack.undo,
            "redo": session.undo_stack.redo,
            "copy_view": self.copy_view,
            "add_stream": lambda: self.going_in.add_stream(),
            "remove_stream": lambda: self._stream("remove"),
            "stream_up": lambda: self._stream("move", -1),
            "stream_down": lambda: self._stream("move", 1),
            "add_restriction": self.held_fixed.restrictions.add_line,
            "add_case": lambda: session.edit(edits.add_case(session.document), "add case"),
            "duplicate_case": lambda: session.edit(
                edits.duplicate_case(session.document), "duplicate case"
            ),
            "rename_case": self.rename_case,
            "notes": lambda: self._show(NotesDialog(self.session, self)),
            "delete_case": lambda: session.edit(edits.delete_case(session.document), "delete case"),
            "next_case": lambda: self._step_case(1),
            "previous_case": lambda: self._step_case(-1),
            "go_in": lambda: self.going_in.focus_first(),
            "go_fixed": lambda: self.held_fixed.menu.setFocus(),
            "go_form": lambda: self.may_form.view.setFocus(),
            "go_end": lambda: self.ends_up.current_table().setFocus(),
            "go_what_if": lambda: self.what_if.T_from.setFocus(),
            "tab_composition": lambda: self.ends_up.show_tab("Composition"),
            "tab_phases": lambda: self.ends_up.show_tab("Phases"),
            "tab_reactions": lambda: self.ends_up.show_tab("Reactions"),
            "tab_energy": lambda: self.ends_up.show_tab("Energy"),
            "tab_proof": lambda: self.ends_up.show_tab("Proof"),
            "tab_gas": lambda: self.ends_up.show_tab("Gas"),
            "log_plot": lambda: self.what_if.set_logarithmic(not session.case.plot.logarithmic),
            "log_bars": lambda: self.ends_up.toggle_bars(),
            "theme": self.next_theme,
            "stop": self.stop,
            "menu": lambda: self.header.menu_button.showMenu(),
            "keys": lambda: self._show(KeysDialog(actions.key_list(), self)),
            "about": lambda: self._show(AboutDialog(self)),
        }

    # -- what the actions do

    def _stream(self, what: str, *args: int) -> None:
        section = self.going_in.current_section()
        if section is not None:
            getattr(section, what)(*args)

    def _step_case(self, step: int) -> None:
        count = len(self.session.project.cases)
        self.session.look_at((self.session.document.index + step) % count)

    def rename_case(self) -> None:
        """Ask for the case's name."""
        name, ok = QInputDialog.getText(
            self, "Rename the case", "Name of the case", text=self.session.case.name
        )
        if ok and name.strip():
            document = edits.rename_case(self.session.document, name.strip())
            self.session.edit(document, "rename case")

    def copy_view(self) -> None:
        """Put the view of the end state that is looked at on the clipboard."""
        self.ends_up.copy()
        title = TABS[self.ends_up.tabs.currentIndex()]
        self.session.messages.note(f"{title}: copied, ready for a spreadsheet.")

    def next_theme(self) -> None:
        """As the system, light, dark, and round again."""
        order = ("system", "light", "dark")
        choice = order[(order.index(self.theme.choice) + 1) % 3]
        self.theme.choose(choice)
        self.preferences.theme = choice
        self.session.messages.note(f"Theme: {'as the system' if choice == 'system' else choice}.")

    def stop(self) -> None:
        """Stop whatever computes."""
        if not self.session.is_idle():
            self.session.cancel()
        if not self.what_if.is_idle():
            self.what_if.cancel()
        self.ends_up.gas.beside.cancel()

    def popup_recent(self) -> None:
        """Show the recent files."""
        menu = self.header.recent
        menu.popup(self.header.mapToGlobal(self.header.rect().bottomLeft()))

    def _fill_recent(self, menu: QMenu) -> None:
        menu.clear()
        for path in self.preferences.recent():
            action = menu.addAction(path.name)
            action.setToolTip(str(path))
            action.triggered.connect(lambda _=False, p=path: self.files.open_path(p))
        if menu.isEmpty():
            menu.addAction("No recent files").setEnabled(False)
            return
        menu.addSeparator()
        menu.addAction("Forget these").triggered.connect(self.preferences.clear_recent)

    def _show(self, dialog) -> None:  # type: ignore[no-untyped-def]
        dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        dialog.open()

    def _show_bug(self, text: str) -> None:
        self._show(BugReport(text, self))

    # -- title, stack, window events

    def _retitle(self) -> None:
        self.setWindowTitle(f"{self.files.name()}[*] – Thalweg")
        self.setWindowModified(self.session.modified)
        if self.session.path:
            self.setWindowFilePath("")

    def _follow_stack(self) -> None:
        stack = self.session.undo_stack
        for name, can, text in (
            ("undo", stack.canUndo(), stack.undoText()),
            ("redo", stack.canRedo(), stack.redoText()),
        ):
            action = self.actions_by_name[name]
            action.setEnabled(can)
            words = name.capitalize()
            action.setText(f"{words} {text}".strip())
            action.setIconText(words)
            action.setToolTip(f"{action.text()} ({action.shortcut().toString()})")

    def showEvent(self, event: QShowEvent) -> None:
        """Bring in the plot once the window is seen."""
        super().showEvent(event)
        if not self._painted:
            self._painted = True
            self._share_height()
            QTimer.singleShot(0, self, self._after_first_paint)

    def _share_height(self) -> None:
        """Answer and plot share the height as 56 to 44 until the user moves the line."""
        height = self.right.height()
        self.right.setSizes([round(height * 0.56), round(height * 0.44)])

    def _after_first_paint(self) -> None:
        QApplication.processEvents()
        self.what_if.load_plot()
        self._share_height()
        self.going_in.focus_first()

    def closeEvent(self, event: QCloseEvent) -> None:
        """Ask about unsaved changes; then wait for the workers."""
        if not self.files.may_leave():
            event.ignore()
            return
        self.preferences.geometry = self.saveGeometry()
        self.files.recovery.forget()
        self.shut()
        super().closeEvent(event)

    def is_idle(self) -> bool:
        """Whether all that is shown is as new as it will get."""
        return (
            self.session.is_idle() and self.what_if.is_idle() and self.ends_up.gas.beside.is_idle()
        )

    def shut(self) -> None:
        """Stop all work in the background."""
        self.what_if.close_jobs()
        self.ends_up.gas.beside.close_jobs()
        self.session.close()

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        """Take a single file."""
        if dropped(event) is not None:
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        """Open the file that was dropped."""
        path = dropped(event)
        if path is not None:
            event.acceptProposedAction()
            self.files.open_path(path)


def dropped(event: QDropEvent) -> Path | None:
    """The one file that is dragged, if it is one."""
    urls = event.mimeData().urls()
    if len(urls) == 1 and urls[0].isLocalFile():
        return Path(urls[0].toLocalFile())
    return None
