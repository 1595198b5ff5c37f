"""Edits of a case's gas model and its k_ij as pure functions."""

from __future__ import annotations

from collections.abc import Sequence

from gui.document import replaced
from solver.project.model import Case, Interaction


def set_gas(case: Case, key: str) -> Case:
    """The case with another gas model; its own k_ij stay, used or not."""
    return replaced(case, gas=key)


def set_pair(case: Case, row: int, **changes: object) -> Case:
    """The case with one pair changed; the row after the last one is made."""
    pairs = list(case.interactions)
    if row == len(pairs):
        pairs.append(Interaction())
    pairs[row] = replaced(pairs[row], **changes)
    return replaced(case, interactions=tuple(pairs))


def put_pairs(case: Case, row: int, new: Sequence[Interaction]) -> Case:
    """The case with pairs written over from `row` on, as a paste does."""
    old = case.interactions
    return replaced(case, interactions=(*old[:row], *new, *old[row + len(new) :]))


def remove_pairs(case: Case, rows: Sequence[int]) -> Case:
    """The case without some pairs."""
    gone = set(rows)
    kept = tuple(pair for i, pair in enumerate(case.interactions) if i not in gone)
    return replaced(case, interactions=kept)
