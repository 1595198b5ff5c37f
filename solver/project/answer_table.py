"""Answers as a table in the terminal."""

from __future__ import annotations

import math
import sys
from collections.abc import Sequence
from typing import Final

from rich import box
from rich.console import Console
from rich.table import Table

from solver.errors import SettleError
from solver.project import units
from solver.project.answer_json import cost_is
from solver.project.beside import CaseBeside
from solver.project.case import CaseAnswer
from solver.project.cautions import cautions
from solver.project.gas_table import print_beside, print_gas, proof_of_search
from solver.project.model import Case, Project
from solver.project.reaction_table import print_reactions
from solver.project.wording import one_line, typeset
from solver.reactions import ReactionsView

SHOWN: Final = 1e-6
"""Share of a fluid phase from which a species is printed; the rest is counted in one line."""
NEAR: Final = 1e-3
"""Activity from which a condensed species that did not form is printed."""

LARGE: Final = 1e5
"""kJ or kW from which MJ or MW are printed."""


class _Console(Console):
    def on_broken_pipe(self) -> None:
        """Leave it to the command whether a reader that stops early is a fault."""
        raise


def console() -> Console:
    """A console on standard output that never breaks or colours what is piped elsewhere."""
    out = _Console(file=sys.stdout, highlight=False, markup=False, soft_wrap=True)
    if not out.is_terminal:
        out.width = 160
    return out


def print_answers(
    project: Project,
    results: Sequence[tuple[Case, CaseAnswer | SettleError]],
    reactions: Sequence[ReactionsView | None] | None = None,
    beside: Sequence[CaseBeside | SettleError | None] | None = None,
) -> None:
    """Print every case that settled, with its reactions and the ideal answer where given.

    The faults of the others are on standard error.
    """
    views = [None] * len(results) if reactions is None else reactions
    out = console()
    if any(isinstance(found, CaseAnswer) for _, found in results) and project.title:
        out.print(one_line(project.title), style="bold")
    pairs = []
    for place, ((case, found), view) in enumerate(zip(results, views, strict=True)):
        if isinstance(found, CaseAnswer):
            _print(out, case, found, view)
            if beside is not None:
                print_beside(out, beside[place])
            out.print()
            pairs.append(case.fixed.pair)
    sentences = dict.fromkeys(sentence for pair in pairs for sentence in cautions(pair))
    for sentence in sorted(sentences, key=lambda s: s == cautions("T,p")[-1]):
        out.print(sentence, style="dim")


def _print(out: Console, case: Case, answer: CaseAnswer, view: ReactionsView | None) -> None:
    end = answer.end
    flow = answer.basis == "flow"
    amount_unit, amount_factor = ("kmol/h", 3.6) if flow else ("mol", 1.0)
    out.print()
    out.print(f"{one_line(case.name)}  ({case.fixed.pair} held)", style="bold")
    number = units.number_text
    celsius = number(units.from_si(end.T, "degC", "temperature"))
    out.print(f"  T     {number(end.T)} K = {celsius} °C")
    out.print(f"  p     {number(end.p / 1e5)} bar")
    out.print(f"  V     {number(end.V * (3600 if flow else 1))} {'m³/h' if flow else 'm³'}")
    out.print(f"  {answer.heat_is:<4}  {_heat(answer)}")
    out.print()
    table, traces = _composition(answer, amount_unit, amount_factor)
    out.print(table)
    if traces:
        what = "gas species" if end.fluids else "gases"
        out.print(f"  and {traces} {what} below 1 ppm each")
    phases = end.phase_amounts
    out.print(
        "  phases  "
        + ", ".join(f"{key} {number(n * amount_factor)} {amount_unit}" for key, n in phases.items())
    )
    print_gas(out, answer)
    _print_absent(out, answer)
    _print_restrictions(out, answer)
    proof = end.proof
    out.print(
        f"  proof   elements {_small(proof.element_residual)}, energy "
        f"{_small(proof.energy_residual)}, gap {_small(proof.gap)} (relative)"
    )
    if searched := proof_of_search(answer):
        out.print(f"          {searched}")
    out.print(f"  model   {typeset(proof.model)}")
    for message in answer.messages:
        out.print(f"  note    {one_line(message)}")
    if view is not None:
        print_reactions(out, answer, view)


def _heat(answer: CaseAnswer) -> str:
    """The heat or work in kJ or kW; rounding of an adiabatic case is no heat."""
    scale = abs(answer.fed.H) + abs(answer.end.H)
    if abs(answer.heat) <= 1e-9 * scale:
        return "0 (none crosses the wall)"
    unit = "kW" if answer.basis == "flow" else "kJ"
    way = "taken up" if answer.heat > 0 else "given off"
    if answer.heat_is == "work":
        way = "put in, reversible" if answer.heat > 0 else "gained, reversible"
    value = answer.heat / 1e3
    if abs(value) >= LARGE:
        value, unit = value / 1e3, f"M{unit[1:]}"
    return f"{units.quantity_text(value, unit)} ({way})"


def _small(value: float) -> str:
    return units.number_text(abs(value), 2)


def _composition(answer: CaseAnswer, unit: str, factor: float) -> tuple[Table, int]:
    """The table of what is there, phase by phase, and how many gases are too little to print."""
    end = answer.end
    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False, padding=(0, 1))
    table.add_column("  species")
    table.add_column("name", style="dim", max_width=34, no_wrap=True)
    table.add_column(unit, justify="right")
    table.add_column("mol % of phase", justify="right")
    table.add_column("phase")
    by_key = {sp.key: sp for sp in end.species}
    printed = set()
    pure = "pure " if end.fluids else ""
    for name, held in end.phases.items():
        total = sum(held.values())
        shares = {key: n / total for key, n in held.items()}
        for key in sorted(held, key=lambda key: -held[key]):
            sp = by_key[key]
            if sp.phase == "gas" and shares[key] < SHOWN:
                continue
            printed.add(key)
            table.add_row(
                f"  {key}",
                sp.name,
                units.number_text(held[key] * factor),
                units.number_text(100 * shares[key]),
                name if name != key else f"{pure}{sp.phase}",
            )
    traces = sum(sp.phase == "gas" and sp.key not in printed for sp in end.species)
    return table, traces


def _print_absent(out: Console, answer: CaseAnswer) -> None:
    absent = answer.end.proof.absent
    near = sorted(((a, key) for key, a in absent.items() if a >= NEAR), reverse=True)
    if near:
        listed = ", ".join(f"{key} {units.number_text(a, 3)}" for a, key in near)
        out.print(f"  absent  {listed} (activity; forms at 1)")
    if len(near) < len(absent):
        rest = len(absent) - len(near)
        out.print(f"          {rest} {'more ' if near else ''}condensed below {NEAR:g}")


def _print_restrictions(out: Console, answer: CaseAnswer) -> None:
    """What is held back and how much lower the free energy would lie without it."""
    unit = "kW" if answer.basis == "flow" else "kJ"
    # Differences of two end states: what is below their own rounding is none.
    rounding = 1e-10 * (abs(answer.end.G) + abs(answer.end.U))
    costs = answer.end.proof.restrictions
    for cost in costs:
        if math.isnan(cost.energy):
            price = "its cost could not be settled"
        elif cost.energy <= rounding:
            price = "costs nothing" + (" while the others hold" if len(costs) > 1 else "")
        else:
            price = f"costs {units.quantity_text(cost.energy / 1e3, unit)} of {cost_is(answer)}"
        out.print(f"  held    {typeset(one_line(cost.restriction))}; {price}")
