"""What goes in: the streams of the case."""

from __future__ import annotations

from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QHBoxLayout, QScrollArea, QVBoxLayout, QWidget

from gui import edits
from gui.parts.card import Card, Label, Sentence, link
from gui.parts.stream_section import StreamSection
from gui.readings import stream_shares
from gui.session import Session
from gui.tables.stream_model import SPECIES
from gui.theme import GRID, Theme
from solver.project.wording import number_text


class GoingIn(Card):
    """A section per stream, and the way to another one."""

    def __init__(self, session: Session, theme: Theme) -> None:
        super().__init__("Going in")
        self._session = session
        self._theme = theme
        self.sections: list[StreamSection] = []
        self._column = QVBoxLayout()
        self._column.setContentsMargins(0, 0, GRID // 2, 0)
        self._column.setSpacing(0)
        self._empty = Label("Nothing goes in yet.", "muted")
        self._column.addWidget(self._empty)
        self.sentence = Sentence()
        self.add = link("+ another stream", "Add a stream (Ctrl+Shift+A)")
        self.add.clicked.connect(lambda: self.add_stream())
        inner = QWidget()
        outer = QVBoxLayout(inner)
        outer.setContentsMargins(0, 0, 0, 0)
        outer.setSpacing(0)
        outer.addLayout(self._column)
        foot = QHBoxLayout()
        foot.addWidget(self.add)
        foot.addStretch(1)
        outer.addLayout(foot)
        outer.addWidget(self.sentence)
        outer.addStretch(1)
        area = QScrollArea()
        area.setWidgetResizable(True)
        area.setWidget(inner)
        area.setFocusPolicy(area.focusPolicy().NoFocus)
        self._area = area
        self.body.addWidget(area, 1)
        session.document_changed.connect(self.refresh)
        session.answer_changed.connect(self.show_answer)
        self.refresh()

    def refresh(self) -> None:
        """As many sections as streams, each showing its own."""
        streams = self._session.case.streams
        while len(self.sections) > len(streams):
            section = self.sections.pop()
            self._column.removeWidget(section)
            section.hide()
            section.deleteLater()
        for section in self.sections:
            section.refresh()
        while len(self.sections) < len(streams):
            section = StreamSection(self._session, self._theme, len(self.sections))
            self.sections.append(section)
            self._column.addWidget(section)
        self._empty.setVisible(not streams)
        self.add.setText("+ another stream" if streams else "+ add a stream")
        self.show_answer()

    def show_answer(self) -> None:
        """Faults, shares and the sum of what goes in."""
        answer = self._session.answer
        prepared = answer.value.prepared if answer.state == "settled" and answer.value else None
        for section, stream in zip(self.sections, self._session.case.streams, strict=True):
            section.show_faults(stream_shares(stream) if prepared is not None else None)
        own = [f for f in self._session.faults_at("streams") if "[" not in f.field]
        self.sentence.say("\n".join(f.text for f in own))
        count = len(self.sections)
        text = "" if not count else "1 stream" if count == 1 else f"{count} streams"
        if prepared is not None:
            text += ", " + total_text(prepared)
        self.remark.setText(text)

    def add_stream(self) -> None:
        """Add a stream and go to its first row."""
        self._session.edit_case(edits.add_stream(self._session.case), "add stream")
        section = self.sections[-1]
        QTimer.singleShot(0, section, lambda: self._enter(section))

    def _enter(self, section: StreamSection) -> None:
        self._area.ensureWidgetVisible(section)
        section.view.setFocus()
        section.view.setCurrentIndex(section.model.index(section.model.rowCount() - 1, SPECIES))

    def focus_first(self) -> None:
        """Go to the first stream's rows."""
        if not self.sections:
            self.add.setFocus()
        else:
            view = self.sections[0].view
            view.setFocus()
            if not view.currentIndex().isValid():
                view.setCurrentIndex(view.model().index(0, SPECIES))

    def current_section(self) -> StreamSection | None:
        """The section that holds the focus, else the last one."""
        holder = next((s for s in self.sections if s.isAncestorOf(s.focusWidget() or s)), None)
        for section in self.sections:
            focus = section.window().focusWidget()
            if focus is not None and section.isAncestorOf(focus):
                return section
        return holder or (self.sections[-1] if self.sections else None)


def total_text(prepared) -> str:  # type: ignore[no-untyped-def]
    """The amount of everything that goes in."""
    total = sum(prepared.feed.values())
    if prepared.basis == "flow":
        return f"{number_text(total * 3.6)} kmol/h"
    return f"{number_text(total)} mol" if total < 1e4 else f"{number_text(total / 1e3)} kmol"
