"""Pure liquids above their critical temperature: what a record that goes on cannot know."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from species_db import Species


def above_critical(
    present: Sequence[Species], candidates: Sequence[Species], T: float
) -> tuple[str, ...]:
    """A sentence for each pure liquid that is present above the critical point of its gas.

    Parameters
    ----------
    present : sequence of Species
        The species that are there.
    candidates : sequence of Species
        Among them the gas is looked for, which carries the critical temperature.
    T : float
        K.
    """
    out = []
    for liquid in present:
        if liquid.phase != "liquid" or not liquid.cas:
            continue
        critical = next(
            (sp.Tc for sp in candidates if sp.phase == "gas" and sp.cas == liquid.cas and sp.Tc),
            None,
        )
        if critical is not None and T > critical:
            out.append(
                f"{liquid.key} is present at {T:.4g} K, above its critical temperature of "
                f"{critical:.4g} K, where no liquid exists: T, p and amounts are wrong by what it "
                "holds. Take it out of the candidates, or choose the gas model srk or pr."
            )
    return tuple(out)
