"""Molar volumes of condensed records without a measured density: estimated, and marked so.

A record whose other state of aggregation is measured takes that volume, a tenth more for the
liquid (common practice, no source). An element takes the median atom of the
measured elements of its state; any other record is built up from the volumes of its elements,
fitted to the measured records of its state by least squares (additive volumes after Kopp; from
memory).
"""

import math
from collections.abc import Sequence

import numpy as np

from species_db.build.draft import Draft

FLAG = "volume_estimated"
EXPANSION = 1.1
FEWEST = 3
"""Measured records that an element needs; with fewer it counts as the average atom."""
BOUNDS = (3e-6, 30e-6)
"""Volume that one atom may be given, m3/mol."""


WITHOUT_CAS = {("Hg", "liquid"): 14.82e-6}
"""Measured volumes of elements whose record carries no CAS number, m3/mol (from memory)."""


def estimate_volumes(drafts: Sequence[Draft]) -> int:
    """Give every condensed draft a volume; returns how many were estimated."""
    condensed = [d for d in drafts if d.phase != "gas"]
    for d in condensed:
        if len(d.elements) == 1 and d.atoms == 1.0:
            known = WITHOUT_CAS.get((next(iter(d.elements)), d.phase))
            d.molar_volume = known if known is not None else d.molar_volume
    measured = {
        (d.identity, d.phase): d.molar_volume for d in condensed if not math.isnan(d.molar_volume)
    }
    atoms = {phase: _fit([d for d in condensed if d.phase == phase]) for phase in _STATES}
    count = 0
    for d in condensed:
        if not math.isnan(d.molar_volume):
            continue
        other = "liquid" if d.phase == "solid" else "solid"
        partner = next(
            (v for (identity, phase), v in measured.items()
             if phase == other and identity == d.identity), None,
        )  # fmt: skip
        if partner is not None:
            d.molar_volume = partner * (EXPANSION if d.phase == "liquid" else 1.0 / EXPANSION)
        elif len(d.elements) == 1:  # atoms of compounds say little of an element
            same = [k for k in condensed if k.phase == d.phase and len(k.elements) == 1]
            known = [v / k.atoms for k in same if (v := measured.get((k.identity, k.phase)))]
            d.molar_volume = d.atoms * float(np.median(known))
        else:
            own, average = atoms[d.phase]
            d.molar_volume = sum(n * own.get(e, average) for e, n in d.elements.items())
        d.flags.append(FLAG)
        count += 1
    return count


_STATES = ("solid", "liquid")


def _fit(drafts: Sequence[Draft]) -> tuple[dict[str, float], float]:
    """Volume of an atom of each element, and of the average atom, m3/mol."""
    known = [d for d in drafts if not math.isnan(d.molar_volume)]
    uses: dict[str, int] = {}
    for d in known:
        for element in d.elements:
            uses[element] = uses.get(element, 0) + 1
    elements = sorted(e for e, n in uses.items() if n >= FEWEST)
    average = float(np.median([d.molar_volume / d.atoms for d in known]))
    rows = [d for d in known if set(d.elements) <= set(elements)]
    A = np.array([[d.elements.get(e, 0.0) for e in elements] for d in rows])
    volume = np.array([d.molar_volume for d in rows])
    weight = 1.0 / volume[:, None]  # relative errors count alike
    fitted = np.linalg.lstsq(A * weight, np.ones(len(rows)), rcond=None)[0]
    return {e: float(np.clip(v, *BOUNDS)) for e, v in zip(elements, fitted, strict=True)}, average
