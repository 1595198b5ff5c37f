"""What an equation of state did, in lines of the terminal, and the ideal answer beside it."""

from __future__ import annotations

from typing import Final

from rich import box
from rich.console import Console
from rich.table import Table

from solver.errors import SettleError
from solver.project import units
from solver.project.beside import CaseBeside
from solver.project.case import CaseAnswer
from solver.project.gas import pairs_text
from solver.project.wording import one_line, typeset

SEEN: Final = 1e-6
"""Share of all moles from which a species taken as ideal is named."""
_ROUNDING: Final = 1e-9


def print_gas(out: Console, answer: CaseAnswer) -> None:
    """Print the gas model, what it leaves out or cannot hold, and where it is poor."""
    end, model = answer.end, answer.prepared.gas
    if model.is_ideal:
        return
    out.print(f"  gas     {model.name}; {pairs_text(model, answer.prepared.candidates)}")
    if end.left_out:
        held = ", ".join(end.left_out)
        out.print(f"  left out  {held}: the liquid of the equation of state stands for it")
    total = sum(end.amounts.values())
    seen = [key for key in end.taken_as_ideal if end.amounts[key] > SEEN * total]
    rest = len(end.taken_as_ideal) - len(seen)
    if end.taken_as_ideal:
        named = ", ".join(seen)
        more = f"{rest} {'more in traces' if seen else 'species, in traces only'}" if rest else ""
        said = " and ".join(part for part in (named, more) if part)
        out.print(f"  taken as ideal, without usable critical constants: {said}")
    for sentence in end.cautions:
        out.print(f"  caution {one_line(typeset(sentence))}")


def proof_of_search(answer: CaseAnswer) -> str:
    """What the proof of a real mixture says besides closure, "" for an ideal one."""
    proof = answer.end.proof
    if proof.rigorous or proof.stationarity is None or proof.tangent_distance is None:
        return ""
    number = units.number_text
    return (
        f"stationarity {number(proof.stationarity, 2)}, tangent-plane distance "
        f"{number(proof.tangent_distance, 2)} RT from {proof.starts} starts: no better state "
        "found; no rigorous bound"
    )


def print_beside(out: Console, beside: CaseBeside | SettleError | None) -> None:
    """Print what an ideal gas would have given; None where the gas is ideal already."""
    out.print()
    if beside is None:
        out.print("  ideal beside real: the gas of this case is ideal already")
        return
    if isinstance(beside, SettleError):
        out.print(f"  ideal beside real: none with an ideal gas. {one_line(str(beside))}")
        return
    real, ideal = beside.real, beside.ideal
    flow = real.basis == "flow"
    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False, padding=(0, 1))
    for title in ("  ideal beside real", "real", "ideal", "real less ideal"):
        side = "left" if title.startswith("  ") else "right"
        table.add_column(title, justify=side, no_wrap=True)  # type: ignore[arg-type]

    def add(words: str, a: float, b: float) -> None:
        change = a - b
        change = 0.0 if abs(change) <= _ROUNDING * max(abs(a), abs(b)) else change
        number = units.number_text
        sign = "+" if change > 0 else ""
        table.add_row(f"  {words}", number(a), number(b), f"{sign}{number(change)}")

    per_hour = 3600.0 if flow else 1.0
    add("T, K", real.end.T, ideal.end.T)
    add("p, bar", real.end.p / 1e5, ideal.end.p / 1e5)
    add("V, m³/h" if flow else "V, m³", real.end.V * per_hour, ideal.end.V * per_hour)
    add(f"{real.heat_is}, {'kW' if flow else 'kJ'}", *_heats(beside))
    gas = beside.gas_shares()
    if min(gas) < 1.0:
        add("gas, % of all moles", 100 * gas[0], 100 * gas[1])
    for key in beside.main:
        a, b, of = beside.shares(key)
        add(f"{key}, mol % of {of}", 100 * a, 100 * b)
    out.print(table)
    if beside.held_differs:
        out.print("  The ideal case holds as fed what its own, ideal feed has.")


def _heats(beside: CaseBeside) -> tuple[float, float]:
    """kJ or kW; rounding of an adiabatic case is no heat."""
    a, b = (
        0.0
        if abs(found.heat) <= _ROUNDING * (abs(found.fed.H) + abs(found.end.H))
        else found.heat / 1e3
        for found in (beside.real, beside.ideal)
    )
    return a, b
