"""What every answer must be read with; window, command line and sheet show the same words."""

from __future__ import annotations

from typing import Final

from solver.fixed import PAIRS

LIMIT: Final = (
    "Equilibrium is a limit and not a rate: it says where a mixture would end up, not how fast, "
    "nor what it passes on the way."
)
CANDIDATES: Final = "Only the candidates can form; what is not among them is missing here."
SEALED: Final = (
    "The end pressure of a sealed vessel is no design basis for relief or against detonation: it "
    "leaves out pressure piling, shock and the wall."
)
JUDGEMENT: Final = "Local codes and a licensed engineer decide."


def cautions(pair: str) -> tuple[str, ...]:
    """The cautions that go with an answer at a fixed pair."""
    sealed = (SEALED,) if PAIRS[pair].holds_volume else ()
    return (LIMIT, CANDIDATES, *sealed, JUDGEMENT)
