"""The top row: the mark, the usual actions, the case that is looked at, and the proof."""

from __future__ import annotations

from PySide6.QtCore import QSize, Qt
from PySide6.QtGui import QAction, QResizeEvent
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QMenu, QToolButton, QWidget

from gui import icons
from gui.actions import ACTIONS, SECTIONS
from gui.parts.answer_line import gap_text
from gui.readings import something_fed
from gui.session import Session
from gui.theme import GRID, Theme

SHOWN = ("new", "open", "save", "", "undo", "redo")
ROOM_TAKEN = 640
"""Pixels that the other things in the row need."""


class Header(QWidget):
    """Buttons for actions; the case menu; a pill that says how the answer stands."""

    def __init__(self, session: Session, theme: Theme, actions: dict[str, QAction]) -> None:
        super().__init__()
        self.setObjectName("header")
        self.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        self.setFixedHeight(44)
        self._session = session
        self._theme = theme
        self._actions = actions
        row = QHBoxLayout(self)
        row.setContentsMargins(GRID * 2, 0, GRID * 2, 0)
        row.setSpacing(2)
        self.mark = QLabel()
        row.addWidget(self.mark)
        row.addSpacing(GRID)
        for name in SHOWN:
            if not name:
                line = QFrame()
                line.setFixedSize(QSize(1, 20))
                line.setObjectName("rule")
                line.setStyleSheet("max-height: 20px; min-height: 20px;")
                row.addSpacing(GRID)
                row.addWidget(line)
                row.addSpacing(GRID)
                continue
            row.addWidget(self._button(actions[name]))
        self.recent = QMenu("Open recent", self)
        self.menu_button = QToolButton()
        self.menu_button.setText("Menu")
        self.menu_button.setToolTip("All actions and their keys (F10)")
        self.menu_button.setPopupMode(QToolButton.ToolButtonPopupMode.InstantPopup)
        self.menu_button.setMenu(self._menu())
        row.addSpacing(GRID)
        row.addWidget(self.menu_button)
        row.addStretch(1)
        self.title = QToolButton()
        self.title.setAccessibleName("title and notes")
        self.title.setProperty("muted", "true")
        self.title.clicked.connect(actions["notes"].trigger)
        row.addWidget(self.title)
        self.case_button = QToolButton()
        self.case_button.setPopupMode(QToolButton.ToolButtonPopupMode.InstantPopup)
        self.case_button.setAccessibleName("case")
        self.case_menu = QMenu(self.case_button)
        self.case_button.setMenu(self.case_menu)
        self.case_menu.aboutToShow.connect(self._fill_cases)
        row.addWidget(self.case_button)
        row.addStretch(1)
        self.pill = QToolButton()
        self.pill.clicked.connect(actions["tab_proof"].trigger)
        row.addWidget(self.pill)
        session.document_changed.connect(self.refresh)
        session.answer_changed.connect(self._show_pill)
        theme.changed.connect(self._recolour)
        self._recolour()
        self.refresh()
        self._show_pill()

    def _button(self, action: QAction) -> QToolButton:
        button = QToolButton()
        button.setToolButtonStyle(Qt.ToolButtonStyle.ToolButtonTextOnly)
        button.setDefaultAction(action)
        action.setIconText(action.text().removesuffix(" …"))
        action.setToolTip(f"{action.iconText()} ({action.shortcut().toString()})")
        return button

    def _menu(self) -> QMenu:
        menu = QMenu(self)
        for section in SECTIONS:
            part = menu.addMenu(section)
            for row in ACTIONS:
                if row.section != section or row.name == "menu":
                    continue
                part.addAction(self._actions[row.name])
                if row.name == "recent":
                    part.addMenu(self.recent)
        return menu

    def _recolour(self) -> None:
        self.mark.setPixmap(icons.valley(self._theme.tokens.accent, 24))

    def refresh(self) -> None:
        """Show the case's name."""
        cases = self._session.project.cases
        name = self._session.case.name or "Unnamed case"
        at = f"   {self._session.document.index + 1} of {len(cases)}" if len(cases) > 1 else ""
        self.case_button.setText(f"{name}{at}  ▾")
        project = self._session.project
        title = project.title or "Untitled project"
        room = max(self.width() - ROOM_TAKEN, 120)
        room -= self.case_button.sizeHint().width()
        elide = self.title.fontMetrics().elidedText
        self.title.setText(elide(title, Qt.TextElideMode.ElideRight, max(room, 80)))
        notes = f"\n\n{_shortened(project.notes)}" if project.notes else ""
        self.title.setToolTip(f"{title}{notes}\n\nTitle and notes: Ctrl+I")
        self.case_button.setToolTip(
            "Cases of this project: look at, add, duplicate, rename, delete"
        )

    def resizeEvent(self, event: QResizeEvent) -> None:
        """The title takes the room there is."""
        super().resizeEvent(event)
        self.refresh()

    def _fill_cases(self) -> None:
        menu = self.case_menu
        menu.clear()
        for i, case in enumerate(self._session.project.cases):
            action = menu.addAction(case.name or "Unnamed case")
            action.setCheckable(True)
            action.setChecked(i == self._session.document.index)
            action.triggered.connect(lambda _=False, i=i: self._session.look_at(i))
        menu.addSeparator()
        for name in ("add_case", "duplicate_case", "rename_case", "delete_case", "notes"):
            menu.addAction(self._actions[name])

    def _show_pill(self) -> None:
        answer = self._session.answer
        if answer.state == "settled" and answer.value is not None:
            proof = answer.value.end.proof
            if proof.rigorous:
                text, tip = f"proven: gap {gap_text(proof.gap)}", "Look at the proof (Ctrl+5)"
            else:
                text = "no better state found"
                tip = (
                    f"From {proof.starts} starts; with an equation of state there is no rigorous "
                    "bound. Look at the proof (Ctrl+5)"
                )
            self._set_pill("good", text, tip)
        elif answer.state == "settling":
            self._set_pill("wait", "settling", "")
        elif not something_fed(self._session.case):
            self._set_pill("wait", "nothing fed yet", "")
        elif answer.faults:
            count = len(answer.faults)
            text = "1 thing to mend" if count == 1 else f"{count} things to mend"
            self._set_pill("fault", text, "\n".join(f.text for f in answer.faults))
        else:
            self._set_pill("wait", "nothing to settle", "")

    def _set_pill(self, state: str, text: str, tip: str) -> None:
        self.pill.setText(text)
        self.pill.setToolTip(tip)
        if self.pill.property("pill") != state:
            self.pill.setProperty("pill", state)
            self.pill.style().unpolish(self.pill)
            self.pill.style().polish(self.pill)


def _shortened(text: str, most: int = 300) -> str:
    return text if len(text) <= most else text[: most - 1].rstrip() + "…"
