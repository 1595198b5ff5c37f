"""Liquids made from their solid: heat of fusion and melting point, cp of the liquid from Perry.

For solids of the CRC tier whose liquid no source describes. The liquid is tied to the solid at the
melting point by construction.
"""

import json
import math
from dataclasses import replace

from species_db.build.draft import Draft, composition
from species_db.build.hand import run_of
from species_db.build.identity import boiling_point, melting_point
from species_db.build.places import chemicals_rows, number, package_dir
from species_db.build.poly import h_at, s_at
from species_db.formula import parse_formula
from species_db.species import R

CALORIE = 4.184
NEAR = 12.0
"""The solid's range may end this far from the melting point, K."""


def liquid_drafts(solids: list[Draft], have: set[tuple[object, str]]) -> list[Draft]:
    """Liquids of these solids, for compositions without a liquid in `have`."""
    path = package_dir("chemicals") / "Heat Capacity/Perrys Table 2-151.json"
    perry = json.loads(path.read_text("utf-8"))
    cps = {}
    for phases in perry.values():
        liquid = phases.get("l")
        parsed = parse_formula(liquid["Formula"].replace(" ", "")) if liquid else None
        if liquid and parsed:
            cps[composition(dict(parsed[0]))] = (liquid["Const"], liquid["Lin"] or 0.0)
    heats = {
        r["CAS"]: number(r["Hfus"])
        for r in chemicals_rows("Phase Change/CRC Handbook Heat of Fusion.tsv")
    }
    drafts = []
    for solid in solids:
        comp = solid.identity[0]
        melts, heat = melting_point(solid.cas), heats.get(solid.cas, math.nan)
        if comp not in cps or (solid.identity, "liquid") in have:
            continue
        if not melts or math.isnan(heat) or abs(solid.T_max - melts) > NEAR:
            continue
        solid.pieces[-1] = replace(solid.pieces[-1], high=melts)
        h = h_at(solid.pieces, melts) * R + heat
        s = s_at(solid.pieces, melts) * R + heat / melts
        const, slope = cps[comp]
        top = min((boiling_point(solid.cas) or melts + 500.0), melts + 1500.0)
        pieces = run_of(melts, top, [CALORIE * const, CALORIE * slope, 0.0, 0.0], h, s)
        drafts.append(
            Draft(
                "crc",
                f"{solid.cas} l",
                f"{solid.label} (liquid)",
                solid.elements,
                0,
                "liquid",
                pieces,
                solid.cas,
                "crc+perry",
                "solid's record; CRC Handbook (heat of fusion); Perry 8th ed., table 2-151",
                ["made from its solid and the heat of fusion"],
                tied=True,
                t_fusion=melts,
            )
        )
    return drafts
