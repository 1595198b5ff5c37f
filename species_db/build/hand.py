"""Reads ``hand_entries.toml``: substances that no package carries whole."""

import tomllib

import numpy as np

from species_db.build.chain import chain_pieces
from species_db.build.draft import Draft
from species_db.build.places import HERE
from species_db.build.poly import T0, Piece, fit, h_at, s_at
from species_db.formula import parse_formula
from species_db.species import R


def hand_drafts() -> list[Draft]:
    """One draft an entry, in the order of the file."""
    with (HERE / "hand_entries.toml").open("rb") as f:
        entries = tomllib.load(f)["entry"]
    drafts: list[Draft] = []
    for entry in entries:
        drafts.append(_draft(entry, drafts))
    return drafts


def _draft(entry: dict, before: list[Draft]) -> Draft:
    parsed = parse_formula(entry["formula"])
    if parsed is None:
        raise SystemExit(f"hand_entries.toml: {entry['formula']!r} is no formula")
    low = float(entry["from"])
    if "melts" in entry:
        melts = entry["melts"]
        solid = next(d for d in before if d.phase == "solid" and d.identity == (parsed[0], 0))
        h = h_at(solid.pieces, melts["T"]) * R + melts["heat"]
        s = s_at(solid.pieces, melts["T"]) * R + melts["heat"] / melts["T"]
    else:
        h, s = float(entry["h298"]), float(entry["s298"])
    runs: list[list[Piece]] = []
    forms = {}
    for part in entry["parts"]:
        high = float(part["to"])
        run = run_of(low, high, part["cp"], h, s)
        runs.append(run)
        heat = float(part.get("heat", 0.0))
        h = h_at(run, high) * R + heat
        s = s_at(run, high) * R + heat / high
        if heat:
            forms[high] = (part.get("form", ""), part.get("next", ""))
        low = high
    pieces, moves = chain_pieces(runs, forms)
    from_memory = "from memory" in entry["reference"]
    draft = Draft(
        "hand", entry["formula"], entry["name"], dict(parsed[0]), 0, entry["phase"], pieces,
        entry["cas"], "hand", entry["reference"],
        ["entered by hand", *(["partly from memory"] if from_memory else [])], moves,
        entry.get("form", ""), is_reference=entry.get("reference_state", False),
    )  # fmt: skip
    if "melts" in entry:
        draft.tied, draft.t_fusion = True, float(entry["melts"]["T"])
    draft.name = entry["name"]
    return draft


def run_of(low: float, high: float, cp: list[float], h: float, s: float) -> list[Piece]:
    """Pieces for cp = a + b T + c / T^2 + d T^2 (J/(mol K)) from h, s (SI) at `low`."""
    a, b, c, d = cp
    T = np.unique(np.r_[low, np.linspace(low, high, 30), T0 if low < T0 < high else low])
    c_p = a + b * T + c / T**2 + d * T**2
    dh = a * (T - low) + b * (T**2 - low**2) / 2 - c * (1 / T - 1 / low) + d * (T**3 - low**3) / 3
    ds = (
        a * np.log(T / low)
        + b * (T - low)
        - c * (1 / T**2 - 1 / low**2) / 2
        + d * (T**2 - low**2) / 2
    )
    return fit(T, c_p / R, (h + dh) / (R * T), (s + ds) / R, 0).pieces
