"""Edits of a case as pure functions: the old case in, the new case out."""

from __future__ import annotations

from collections.abc import Sequence

from gui.document import Document, replaced
from solver.project.model import Amount, Candidates, Case, Project, Quantity, Stream

AMBIENT_T = Quantity(value=25, unit="degC")
AMBIENT_p = Quantity(value=1, unit="bar")


def blank_project() -> Project:
    """What New opens: one case with one empty stream, ready to be typed in."""
    return Project(cases=(add_stream(Case()),))


# -- streams


def set_stream(case: Case, index: int, **changes: object) -> Case:
    """The case with some fields of one stream changed."""
    streams = list(case.streams)
    streams[index] = replaced(streams[index], **changes)
    return replaced(case, streams=tuple(streams))


def add_stream(case: Case) -> Case:
    """The case with one more stream, at the conditions of the last one."""
    taken = {s.name for s in case.streams}
    number = len(case.streams) + 1
    while f"Stream {number}" in taken:
        number += 1
    T, p = (case.streams[-1].T, case.streams[-1].p) if case.streams else (AMBIENT_T, AMBIENT_p)
    return replaced(case, streams=(*case.streams, Stream(name=f"Stream {number}", T=T, p=p)))


def remove_stream(case: Case, index: int) -> Case:
    """The case without one stream."""
    return replaced(case, streams=case.streams[:index] + case.streams[index + 1 :])


def move_stream(case: Case, index: int, step: int) -> Case:
    """The case with one stream moved up (-1) or down (1)."""
    return replaced(case, streams=_moved(case.streams, index, step))


# -- rows of a stream


def unit_of_next_row(stream: Stream) -> str:
    """The unit a new row starts with: that of the row before."""
    return stream.amounts[-1].unit if stream.amounts else "mol"


def set_amount(case: Case, stream: int, row: int, **changes: object) -> Case:
    """The case with one row changed; the row after the last one is made."""
    amounts = list(case.streams[stream].amounts)
    if row == len(amounts):
        unit = unit_of_next_row(case.streams[stream])
        amounts.append(Amount(species="", value="", unit=unit))
    amounts[row] = replaced(amounts[row], **changes)
    return set_stream(case, stream, amounts=tuple(amounts))


def put_amounts(case: Case, stream: int, row: int, new: Sequence[Amount]) -> Case:
    """The case with rows written over from `row` on, as a paste does."""
    old = case.streams[stream].amounts
    return set_stream(case, stream, amounts=(*old[:row], *new, *old[row + len(new) :]))


def insert_amount(case: Case, stream: int, row: int) -> Case:
    """The case with an empty row at `row`."""
    old = case.streams[stream].amounts
    unit = old[row].unit if row < len(old) else unit_of_next_row(case.streams[stream])
    blank = Amount(species="", value="", unit=unit)
    return set_stream(case, stream, amounts=(*old[:row], blank, *old[row:]))


def remove_amounts(case: Case, stream: int, rows: Sequence[int]) -> Case:
    """The case without some rows."""
    gone = set(rows)
    kept = tuple(a for i, a in enumerate(case.streams[stream].amounts) if i not in gone)
    return set_stream(case, stream, amounts=kept)


def move_amount(case: Case, stream: int, row: int, step: int) -> Case:
    """The case with one row moved up (-1) or down (1)."""
    return set_stream(case, stream, amounts=_moved(case.streams[stream].amounts, row, step))


# -- what is held


def set_value(case: Case, variable: str, quantity: Quantity | None) -> Case:
    """The case with a held value; None: as fed."""
    values = {k: v for k, v in case.fixed.values.items() if k != variable}
    if quantity is not None:
        values[variable] = quantity
    return replaced(case, fixed=replaced(case.fixed, values=values))


def set_fixed(case: Case, **changes: object) -> Case:
    """The case with another pair or heat."""
    return replaced(case, fixed=replaced(case.fixed, **changes))


# -- what may form


def set_candidates(case: Case, **changes: object) -> Case:
    """The case with another rule, elements or phases."""
    return replaced(case, candidates=replaced(case.candidates, **changes))


def allow(case: Case, key: str, by_rule: bool) -> Case:
    """The case in which `key` may form; `by_rule`: the rule names it already."""
    c: Candidates = case.candidates
    excluded = tuple(k for k in c.excluded if k != key)
    added = c.added if by_rule or key in c.added else (*c.added, key)
    return set_candidates(case, excluded=excluded, added=added)


def forbid(case: Case, key: str, by_rule: bool) -> Case:
    """The case in which `key` may not form; a species of the rule is listed as excluded."""
    c: Candidates = case.candidates
    added = tuple(k for k in c.added if k != key)
    excluded = (*c.excluded, key) if by_rule and key not in c.excluded else c.excluded
    return set_candidates(case, excluded=excluded, added=added)


# -- cases of a project


def add_case(document: Document) -> Document:
    """The document with one more, empty case, which is looked at."""
    return _with_new(document, add_stream(Case(name=_free_name(document, "Case"))))


def duplicate_case(document: Document) -> Document:
    """The document with a copy of the current case, which is looked at."""
    name = document.case.name
    return _with_new(document, replaced(document.case, name=_free_name(document, name)))


def rename_case(document: Document, name: str) -> Document:
    """The document with another name for the current case."""
    return document.with_case(replaced(document.case, name=name))


def delete_case(document: Document) -> Document:
    """The document without the current case; the last one is emptied instead."""
    cases = [c for i, c in enumerate(document.project.cases) if i != document.index]
    project = replaced(document.project, cases=tuple(cases) or (Case(),))
    return Document(project, min(document.index, len(project.cases) - 1))


def _with_new(document: Document, case: Case) -> Document:
    at = document.index + 1
    cases = document.project.cases
    project = replaced(document.project, cases=(*cases[:at], case, *cases[at:]))
    return Document(project, at)


def _free_name(document: Document, stem: str) -> str:
    taken = {c.name for c in document.project.cases}
    number = 2
    while f"{stem} {number}" in taken:
        number += 1
    return f"{stem} {number}"


def _moved(items: tuple, index: int, step: int) -> tuple:  # type: ignore[type-arg]
    to = index + step
    if not (0 <= index < len(items) and 0 <= to < len(items)):
        return items
    out = list(items)
    out[index], out[to] = out[to], out[index]
    return tuple(out)
