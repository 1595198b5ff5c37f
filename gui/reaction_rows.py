"""Reactions and hand calculations as rows of small tables; nothing is computed here."""

from __future__ import annotations

import re
from typing import Any

from gui.readings import Units
from gui.tables.figures_model import Cell, Words
from solver.project.wording import MINUS, formula_text, number_text, quantity_text, unit_text

Rows = list[tuple[Cell, ...]]
Table = tuple[tuple[str, ...], Rows]

SET_NOTE = (
    "ΔH°, ΔG° in kJ/mol of the reaction as written, at 1 bar; approach: T less the temperature "
    "at which K = Q."
)
REAL_NOTE = "Q is of activities φ y p / 1 bar, alike in gas and liquid."
_STILL = 1e-6
"""K; an approach of less is rounding."""
_NEGATIVE = re.compile(r"(?<![\w])-(?=\d)")
_MOL = re.compile(r"(\d) mol\b(?!/)")


def set_table(view: Any, units: Units) -> Table:
    """The independent reaction set, a row a reaction."""
    heads = (
        "reaction",
        f"extent, {unit_text(units.amount)}",
        "K(T)",
        "Q",
        "Q/K",
        "ΔH° 298 K",
        "ΔG° 298 K",
        "ΔH° T",
        "ΔG° T",
        "approach, K",
    )
    rows: Rows = []
    for f in view.figures:
        text = Words(f.reaction.pretty, f.reaction.text, "\n".join((f.reaction.pretty, *f.notes)))
        extent = None if f.extent is None else units.amount_of(f.extent)
        away = f.approach.approach
        cells: list[Cell] = [text, extent, f.k, f.q, f.q_over_k]
        cells += [x / 1e3 for x in (f.dh298, f.dg298, f.dh, f.dg)]
        if away is None:
            cells.append(Words("none", "", f.approach.reason))
        else:
            cells.append(0.0 if abs(away) < _STILL else float(away))
        rows.append(tuple(cells))
    return heads, rows


def set_notes(view: Any, own: bool) -> list[str]:
    """Sentences beneath the set: what it leaves out, and what had to be assumed."""
    out = []
    if not view.figures:
        out.append("No reaction takes place between the species that matter here.")
    if own and not view.complete:
        more = view.extents.missing
        out.append(
            f"{more} more independent reaction{'s' if more > 1 else ''} would be needed to "
            "explain every change; the extents are the best fit."
        )
    elif view.left_out:
        count = len(view.left_out)
        out.append(
            f"{count} species present in traces only {'is' if count == 1 else 'are'} left out."
        )
    for f in view.figures:
        out += [f"{f.reaction.pretty}: {formulas(note)}." for note in f.notes]
    return out


def amounts_table(hand: Any, flow: bool) -> Table:
    """The stoichiometric table of a hand calculation."""
    unit = "mol/s" if flow else "mol"
    heads = ("species", "number", f"fed, {unit}", "change", "at the end", "mol % of gas")
    rows: Rows = []
    for row in hand.rows:
        share = None if row.fraction is None else 100.0 * row.fraction
        name = Words(formula_text(row.species.key), row.species.key, row.species.name)
        number = Words(f"{row.number:.6g}".replace("-", MINUS), f"{row.number!r}")
        rows.append((name, number, row.initial, row.change, row.end, share))
    rows.append(
        (
            "all gas",
            Words(f"{hand.reaction.gas_change:.6g}".replace("-", MINUS), ""),
            hand.gas_initial,
            hand.gas_end - hand.gas_initial,
            hand.gas_end,
            100.0 if hand.gas_end else None,
        )
    )
    return heads, rows


def trials_table(hand: Any, flow: bool) -> Table:
    """Extents tried between the limits; ln Q - ln K changes its sign once."""
    heads = (f"extent tried, {'mol/s' if flow else 'mol'}", "ln Q − ln K")
    rows: Rows = [(t.extent, t.off) for t in hand.trials]
    off = hand.ln_q - hand.ln_k
    rows.append((hand.extent, off if abs(off) > 1e-9 else 0.0))
    return heads, sorted(rows)  # type: ignore[type-var]


def energy_table(hand: Any, flow: bool) -> Table:
    """The energy balance of a hand calculation, term by term."""
    heads = ("term", "value", "unit", "how")
    rows: Rows = [
        (
            Words(formulas(t.label), t.label),
            t.value,
            Words(_unit(t.unit, flow), t.unit),
            Words(_how(t.how, flow), t.how),
        )
        for t in hand.energy.terms
    ]
    return heads, rows


def hand_line(hand: Any, flow: bool) -> str:
    """The result of a hand calculation in one line."""
    unit = "mol/s" if flow else "mol"
    low, high = hand.limits
    return (
        f"Extent {quantity_text(hand.extent, unit)}, between {number_text(low.extent)} "
        f"({_used(low)}) and {number_text(high.extent)} ({_used(high)}). "
        f"At {quantity_text(hand.T, 'K')} and {quantity_text(hand.p / 1e5, 'bar')}: "
        f"ln K = {number_text(hand.ln_k)}, ln Q = {number_text(hand.ln_q)}."
    )


def hand_notes(hand: Any, reactions: int, restricted: bool) -> str:
    """What sets a hand calculation apart from the end state of the case."""
    out = [formulas(note) for note in hand.notes]
    if reactions > 1:
        out.append(
            f"the case has {reactions} reactions; with this one alone it ends elsewhere than above"
        )
    if restricted:
        out.append("restrictions are left out here")
    return " ".join(f"{note[:1].upper()}{note[1:]}." for note in out)


def as_tsv(*tables: Table) -> str:
    """Tables as text for a spreadsheet, one beneath the other."""
    blocks = []
    for heads, rows in tables:
        lines = ["\t".join(heads)]
        lines += ["\t".join(_plain(cell) for cell in row) for row in rows]
        blocks.append("\n".join(lines))
    return "\n\n".join(blocks)


def _plain(cell: Cell) -> str:
    if isinstance(cell, Words):
        return cell.plain
    if cell is None:
        return ""
    return repr(cell) if isinstance(cell, float) else cell


def _used(limit: Any) -> str:
    keys = ", ".join(formula_text(key) for key in limit.used_up)
    return f"{keys} used up" if keys else "no limit"


def _unit(unit: str, flow: bool) -> str:
    shown = unit_text(unit)
    return {"J": "W", "m³": "m³/s"}.get(shown, shown) if flow else shown


def _how(how: str, flow: bool) -> str:
    text = _MOL.sub(r"\1 mol/s", how) if flow else how
    return formulas(_NEGATIVE.sub(MINUS, text.replace(" x ", " × ").replace(" - ", f" {MINUS} ")))


def formulas(text: str) -> str:
    """Words that are formulas with their counts lowered."""
    return " ".join(formula_text(word) for word in text.split(" "))
