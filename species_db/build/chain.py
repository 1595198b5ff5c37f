"""Chains condensed forms: one solid record a composition, the liquid tied at the melting point.

At a transition the tabulated latent heat is kept and the entropy of all that lies above is
shifted so that g is the same on both sides. A shift of more than `LIMIT` in g/RT means that the
source contradicts itself: the record above is left out and listed, except where a repair is
written down here.
"""

import copy
import itertools
import re
from collections.abc import Sequence

import numpy as np

from species_db.build.draft import Draft, LeftOut, Move
from species_db.build.janaf_read import DH, HF, S, T, Table
from species_db.build.poly import T0, Piece, cp_at, g_at, h_at
from species_db.species import R

LIMIT = 0.05
ENTROPY_FROM_FUSION = {"Cl-162"}
"""TiCl4(l): the tabulated S298, 221.9, is low by 30.5 J/(mol K); the table's own fusion note, its
boiling point and the CRC Handbook's 252.3 J/(mol K) say so. Tied at fusion all the same."""
_MINERALS = set("Quartz Rutile Anatase Cristobalite Andalusite Kyanite Sillimanite".split())


def condensed(tables: dict[str, list[Table]], out: list[LeftOut]) -> list[Draft]:
    """Drafts of the condensed states of one composition (tables by state)."""
    from species_db.build.janaf import left
    from species_db.build.janaf_cas import REFERENCE_GASES

    reference = [t for t in tables["ref"] if t.display.split(",")[0] not in REFERENCE_GASES]
    sequence = (tables["cr,l"] or reference)[:1]
    drafts: list[Draft] = []
    part_of: set[str] = set()
    solid: Draft | None = None
    if sequence:
        solid, part_of = _solid_of(sequence[0], tables["cr"])
        if solid:
            solid.is_reference = bool(reference)
            solid.is_sequence = True
            drafts.append(solid)
    rest = [t for t in tables["cr"] if t.index not in part_of]
    drafts += _other_forms(rest)
    melt = _melting(sequence[0]) if sequence else None
    for table in tables["l"] or sequence:
        liquid = _liquid_of(table)
        if liquid is None:
            if table in tables["l"]:
                out.append(left(table, "no run of rows above the glass transition"))
            continue
        liquid.is_reference = False
        melts_at = melt or _melting(table)
        base = solid if solid else _crystal_melting(drafts, melts_at)
        if melts_at and base and not _tie(liquid, base, melts_at):
            out.append(left(table, f"melting point misses by more than {LIMIT} in g/RT"))
            continue
        drafts.append(liquid)
    return drafts


def _melting(table: Table) -> float | None:
    """Noted melting point, the highest if there are several."""
    found = [
        t
        for t, note in table.notes
        if re.sub(r" TRANSITION$", "", note).endswith("<--> LIQUID") and "GLASS" not in note
    ]
    return max(found) if found else None


def _boils(table: Table) -> float:
    found = [t for t, note in table.notes if "IDEAL GAS" in note]
    return min(found) if found else np.inf


def _solid_of(table: Table, crystals: Sequence[Table]) -> tuple[Draft | None, set[str]]:
    """Chained solid of a stable sequence, and the crystal tables that are part of it."""
    from species_db.build.janaf import Fitted, draft_of, runs_of

    end = min(_melting(table) or np.inf, _boils(table))
    runs = [r for r in runs_of(table) if table.rows[r[-1], T] <= end + 0.01]
    if not runs:
        return None, set()
    fitted = [Fitted(table, run) for run in runs]
    d = draft_of(table, "solid", [], max(f.error_g for f in fitted))
    d.pieces, d.moves = chain_pieces([f.pieces for f in fitted], forms_noted(table))
    part_of = {c.index for c in crystals if any(_same(table, run, c) for run in runs)}
    first = [c for c in crystals if c.index in part_of and _same(table, runs[0], c)]
    d.form = draft_of(first[0], "solid", d.pieces, 0.0).form if first else ""
    if d.form not in _MINERALS:
        d.form = ""
    return d, part_of


def forms_noted(table: Table) -> dict[float, tuple[str, str]]:
    """Transition temperature -> the two forms, from notes such as ``ALPHA <--> BETA``."""
    forms = {}
    for t, note in table.notes:
        lower, arrow, upper = re.sub(r" TRANSITION$", "", note).partition(" <--> ")
        if arrow and "GLASS" not in note:
            forms[t] = (_named(lower), _named(upper))
    return forms


def _named(form: str) -> str:
    return form if re.fullmatch(r"[IVX]+", form) else form.lower()


def _same(table: Table, run: list[int], crystal: Table) -> bool:
    """Whether a crystal table holds the very values of a run."""
    row = table.rows[run[len(run) // 2]]
    found = np.where(np.abs(crystal.rows[:, T] - row[T]) < 1e-6)[0]
    h = table.at(T0, HF) + row[DH]
    h_crystal = crystal.at(T0, HF)
    return any(
        abs(crystal.rows[i, S] - row[S]) < 0.05 + 2e-3 * row[S]
        and abs(h_crystal + crystal.rows[i, DH] - h) < 0.05 + 2e-4 * abs(h)
        for i in found
    )


def chain_pieces(
    runs: Sequence[Sequence[Piece]], forms: dict[float, tuple[str, str]]
) -> tuple[list[Piece], list[Move]]:
    """Join runs end to start; g continuous, latent heat kept, tiny steps smoothed away."""
    pieces = list(runs[0])
    moves: list[Move] = []
    for run in runs[1:]:
        at = run[0].low
        if abs(pieces[-1].high - at) > 1e-6:
            break
        heat = (h_at(run, at) - h_at([pieces[-1]], at)) * R
        dg = g_at(run, at) - g_at([pieces[-1]], at)
        if abs(dg) > LIMIT:
            break
        # a peak of cp, without latent heat: the small step is rounding or the fit of the peak
        unnamed = at not in forms or not any(forms[at])
        if abs(heat) < 5.0 or ((unnamed or heat < 0) and abs(heat) < 0.1 * R * at):
            run = [p.shifted(dh=-heat / R) for p in run]
            dg -= heat / R / at
            heat = 0.0
        run = [p.shifted(ds=dg) for p in run]
        pieces += run
        if heat:
            lower, upper = forms.get(at, ("", ""))
            moves.append(Move(at, heat, lower, upper))
    return pieces, moves


def _other_forms(tables: Sequence[Table]) -> list[Draft]:
    """Crystal forms with a record of their own; low and high cristobalite are chained."""
    from species_db.build.janaf import Fitted, draft_of, runs_of

    drafts = []
    for table in tables:
        fitted = [Fitted(table, run) for run in runs_of(table)]
        d = draft_of(table, "solid", [], max(f.error_g for f in fitted))
        d.pieces, d.moves = chain_pieces([f.pieces for f in fitted], forms_noted(table))
        d.t_fusion = _melting(table) or np.nan
        drafts.append(d)
    low = next((d for d in drafts if "Cristobalite, Low" in d.label), None)
    high = next((d for d in drafts if "Cristobalite, High" in d.label), None)
    if low and high:
        joined = _join_at_crossing(low, high, 450.0, 600.0)
        if joined:
            drafts = [d for d in drafts if d not in (low, high)] + [joined]
    return drafts


def _join_at_crossing(low: Draft, high: Draft, T_from: float, T_to: float) -> Draft | None:
    """Two forms as one record, joined where their g are equal."""
    grid = np.linspace(T_from, T_to, 601)
    gap = np.array([g_at(high.pieces, t) - g_at(low.pieces, t) for t in grid])
    turn = np.where((gap[:-1] > 0) & (gap[1:] <= 0))[0]
    if not len(turn):
        return None
    at = round(float(grid[turn[0]]), 1)
    joined = copy.copy(low)
    joined.pieces, joined.moves = chain_pieces(
        [cut(low.pieces, high=at), cut(high.pieces, low=at)], {at: ("low", "high")}
    )
    joined.reference = f"{low.reference} and {high.rid}"
    joined.form = "Cristobalite"
    joined.label = low.label.replace(", Low", "")
    return joined


def cut(pieces: Sequence[Piece], low: float = 0.0, high: float = np.inf) -> list[Piece]:
    """Pieces between two temperatures."""
    return [
        Piece(max(p.low, low), min(p.high, high), p.a)
        for p in pieces
        if max(p.low, low) < min(p.high, high)
    ]


def _liquid_of(table: Table) -> Draft | None:
    from species_db.build.janaf import Fitted, draft_of, runs_of

    glass = [t for t, note in table.notes if "GLASS" in note]
    start = max(glass) if glass else 0.0
    if table.state != "l":
        start = max(start, _melting(table) or np.inf)
    end = _boils(table)
    runs = [
        r
        for r in runs_of(table)
        if table.rows[r[0], T] >= start - 0.01 and table.rows[r[-1], T] <= end + 0.01
    ]
    if not runs:
        return None
    fitted = [Fitted(table, run) for run in runs]
    d = draft_of(table, "liquid", [], max(f.error_g for f in fitted))
    d.pieces, d.moves = chain_pieces([f.pieces for f in fitted], forms_noted(table))
    return d


def _crystal_melting(drafts: Sequence[Draft], at: float | None) -> Draft | None:
    """The crystal whose range holds the melting point, the most stable there."""
    if at is None:
        return None
    able = [d for d in drafts if d.phase == "solid" and d.T_min <= at <= d.T_max + 1]
    return min(able, key=lambda d: g_at(d.pieces, at)) if able else None


def _tie(liquid: Draft, solid: Draft, at: float) -> bool:
    """Shift the liquid's entropy so that it melts at the noted temperature; False if too far."""
    if not solid.T_min < at <= solid.T_max + 0.01:
        return True  # the solid's table ends below: nothing to tie to
    dg = (
        g_at(liquid.pieces, at) - g_at([solid.pieces[-1]], at)
        if at >= solid.T_max
        else (g_at(liquid.pieces, at) - g_at(solid.pieces, at))
    )
    if abs(dg) > LIMIT:
        if liquid.rid not in ENTROPY_FROM_FUSION:
            return False
        liquid.flags.append("entropy repaired from the melting and boiling points")
    liquid.shift(ds=dg * R)
    liquid.tied, liquid.t_fusion = True, at
    return True


def chain_blocks(drafts: Sequence[Draft], out: list[LeftOut]) -> list[Draft]:
    """Condensed blocks of one species entry, chained: solids to one record, liquid tied."""
    groups: dict[tuple[str, object], list[Draft]] = {}
    for d in drafts:
        groups.setdefault((d.rid.split(".")[0], d.identity), []).append(d)
    made: list[Draft] = []
    for group in groups.values():
        solids = sorted((d for d in group if d.phase == "solid"), key=lambda d: d.T_min)
        liquids = [d for d in group if d.phase == "liquid"]
        solid: Draft | None = None
        if solids:
            runs = [d.pieces for d in solids]
            forms = {
                b.T_min: (_form_of(a.label), _form_of(b.label))
                for a, b in itertools.pairwise(solids)
                if _form_of(a.label) != _form_of(b.label)
            }
            solid = copy.copy(solids[0])
            solid.pieces, solid.moves = chain_pieces(runs, forms)
            made.append(solid)
            for d in solids[1:]:
                if d.T_min >= solid.T_max - 1e-6:
                    out.append(_lost(d, "does not join the form below it"))
        for liquid in liquids:
            at = solid.T_max if solid else 0.0
            if solid and abs(liquid.T_min - at) < 1.0 and not _tie(liquid, solid, at):
                out.append(_lost(liquid, f"melting point misses by more than {LIMIT} in g/RT"))
                continue
            made.append(liquid)
    return made


def _form_of(label: str) -> str:
    found = re.search(r"\(([IV]+|[a-d]|cr)\)|Solid-?([A-Z])?", label)
    return (found.group(1) or found.group(2) or "").strip() if found else ""


def _lost(d: Draft, reason: str) -> LeftOut:
    return LeftOut(d.origin, d.rid, d.label, d.phase, reason)


def worst_cp(d: Draft) -> float:
    """Lowest cp/R over the range."""
    grid = np.linspace(d.T_min, d.T_max, 300)
    return min(cp_at(d.pieces, t) for t in grid)
