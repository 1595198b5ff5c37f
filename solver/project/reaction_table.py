"""The reactions behind an answer as a table in the terminal."""

from __future__ import annotations

from rich import box
from rich.console import Console
from rich.table import Table

from solver.project import units
from solver.project.case import CaseAnswer
from solver.project.wording import MINUS, one_line
from solver.reactions import Figures, ReactionsView
from solver.restrictions import Inert

_SPANS = ("extent", "ln K", "Q/K", "ΔH(T)", "ΔG(T)", f"T {MINUS} T(K = Q)")

ROUNDING = 1e-9
"""ln K, or kJ/mol, below which a figure is none."""


def print_reactions(out: Console, answer: CaseAnswer, view: ReactionsView) -> None:
    """Print each reaction with its figures, and what the set leaves open.

    Extents count a reaction as it is written, in mol of a batch or kmol/h of a flow; ΔH and ΔG are
    standard values at T and 1 bar. The last column is the temperature of the end state less the
    one at which its composition would be at equilibrium for that reaction.
    """
    unit, factor = ("kmol/h", 3.6) if answer.basis == "flow" else ("mol", 1.0)
    own = bool(answer.prepared.reactions)
    kind = "the set of the case" if own else "an independent set"
    out.print()
    if not view.figures:
        out.print("  reactions  none: nothing that is there can turn into another")
        return
    out.print(f"  reactions  {kind}, standard pressure 1 bar")
    columns = dict(zip(_SPANS, (unit, "", "", "kJ/mol", "kJ/mol", "K"), strict=True))
    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False, padding=(0, 1))
    table.add_column("  equation", no_wrap=True)
    for name, column_unit in columns.items():
        title = f"{name}, {column_unit}" if column_unit else name
        table.add_column(title, justify="right", no_wrap=True)
    for figures in view.figures:
        table.add_row(*_row(figures, factor))
    out.print(table)
    for figures in view.figures:
        said = [*figures.notes]
        if figures.approach.reason and figures.approach.reason not in said:
            said.append(figures.approach.reason)
        for text in dict.fromkeys(said):
            out.print(f"  note    {one_line(figures.reaction.text)}: {one_line(text)}")
    if not view.complete:
        more = view.extents.missing
        out.print(
            f"  note    {more} more independent {'reactions are' if more > 1 else 'reaction is'} "
            "possible among the species present"
        )
    if own and not view.extents.closed:
        rest = sorted(view.extents.unexplained.items(), key=lambda item: -abs(item[1]))
        worst = ", ".join(f"{sp.key} {units.quantity_text(n * factor, unit)}" for sp, n in rest[:4])
        out.print(f"  note    not explained by these reactions: {worst}")
    if any(isinstance(held, Inert) for held in answer.prepared.restrictions):
        out.print("  note    Q counts what is held inert too")
    if view.left_out:
        most = max(view.left_out, key=lambda key: view.left_out[key])
        amount = units.quantity_text(view.left_out[most] * factor, unit)
        out.print(
            f"  note    left out: {len(view.left_out)} species in traces, most of all {most} "
            f"({amount})"
        )


def _row(figures: Figures, factor: float) -> tuple[str, ...]:
    def number(value: float) -> str:
        # What a reaction at K = 1 leaves of ln K and ΔG is rounding.
        return units.number_text(0.0 if abs(value) < ROUNDING else value)

    off = figures.approach.approach
    return (
        f"  {one_line(figures.reaction.text)}",
        "–" if figures.extent is None else units.number_text(figures.extent * factor),
        number(figures.ln_k),
        "–" if figures.q_over_k is None else units.number_text(figures.q_over_k),
        number(figures.dh / 1e3),
        number(figures.dg / 1e3),
        "–" if off is None else difference_text(off),
    )


def difference_text(kelvin: float) -> str:
    """A temperature difference to a hundredth of a kelvin."""
    text = f"{abs(kelvin):.2f}"
    return text if kelvin >= 0 or float(text) == 0 else MINUS + text
