"""Gate on molecular liquids: where g of liquid and gas are equal must be the boiling point."""

import numpy as np

from species_db.build.draft import Draft, LeftOut
from species_db.build.identity import boiling_point
from species_db.build.poly import g_at

LIMIT = 10.0
NOTED = 2.0
PAIRED = {"64-19-7", "64-18-6"}
"""Acetic and formic acid: the vapour is mostly a dimer, the gas of the formula says nothing."""
"""Largest miss of the boiling point, K, at which a liquid of the constant-cp tier is kept."""
SEARCH = 120.0


def equal_g(liquid: Draft, gas: Draft, near: float) -> float:
    """Temperature nearest to `near` where liquid and ideal gas have one g at 1 bar, or nan."""
    grid = np.linspace(max(near - SEARCH, 100.0), near + SEARCH, 241)
    gap = np.array([g_at(liquid.pieces, t) - g_at(gas.pieces, t) for t in grid])
    turn = np.where((gap[:-1] <= 0) & (gap[1:] > 0))[0]
    if not len(turn):
        return float("nan")
    i = min(turn, key=lambda k: abs(grid[k] - near))
    return float(grid[i] - gap[i] * (grid[i + 1] - grid[i]) / (gap[i + 1] - gap[i]))


def gate(drafts: list[Draft], out: list[LeftOut]) -> list[Draft]:
    """Drop constant-cp liquids that boil more than `LIMIT` off; mark the untestable ones."""
    gases = {d.cas: d for d in drafts if d.phase == "gas" and d.cas and not d.charge}
    kept = []
    for d in drafts:
        if d.phase == "liquid" and d.origin == "crc298":
            boils, gas = boiling_point(d.cas), gases.get(d.cas)
            if not boils or gas is None or d.cas in PAIRED:
                d.flags.append("boiling point not checked")
            else:
                miss = equal_g(d, gas, boils) - boils
                if abs(miss) > NOTED:
                    d.flags.append(f"boils {miss:+.0f} K off against its gas")
                if not abs(miss) <= LIMIT:
                    reason = f"boils more than {LIMIT:g} K off against its gas"
                    out.append(LeftOut(d.origin, d.rid, d.label, d.phase, reason))
                    continue
        kept.append(d)
    return kept
