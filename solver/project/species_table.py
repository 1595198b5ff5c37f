"""What is known of a species, in the terminal."""

from __future__ import annotations

import tomllib
from functools import cache
from importlib import resources
from typing import TYPE_CHECKING, Any, Final

from rich import box
from rich.console import Console
from rich.table import Table

from solver.project import units
from solver.project.answer_table import console
from species_db import SECOND_T, T_STANDARD, UnknownSpecies

if TYPE_CHECKING:
    from species_db import Library, Species

HITS: Final = 20
SEE_ALSO: Final = 6


def print_species(library: Library, text: str) -> None:
    """Print the species that a text names, or all that it may mean.

    Raises
    ------
    UnknownSpecies
        When nothing answers to the text, not even in part.
    """
    out = console()
    try:
        named: Species | None = library[text]
        unknown = None
    except UnknownSpecies as error:
        named, unknown = None, error
    hits = library.find(text, HITS)
    if unknown is not None and not hits:
        raise unknown
    if named is not None:
        _print_one(out, named)
        hits = [sp for sp in hits if sp.key != named.key][:SEE_ALSO]
        if hits:
            out.print()
            out.print("See also", style="bold")
    if hits:
        out.print(_list(hits))
    if len(hits) >= HITS - 1:
        out.print(f"The first {len(hits)} are shown; write more of the name.")


def _print_one(out: Console, sp: Species) -> None:
    number = units.number_text
    out.print(f"{sp.key}  {sp.name}", style="bold")
    atoms = ", ".join(f"{element} {n:g}" for element, n in sp.elements.items())
    facts = [
        ("formula", units.formula_text(sp.key)),
        ("atoms", atoms + (f", charge {sp.charge:+d}" if sp.charge else "")),
        ("phase", sp.phase),
        ("data", f"{sp.T_min:g} to {sp.T_max:g} K"),
        ("h at 298.15 K", _h298(sp)),
        ("s at 298.15 K", f"{number(sp.s(T_STANDARD), 5)} J/(mol K)"),
        ("cp at 298.15 K", f"{number(sp.cp(T_STANDARD))} J/(mol K)"),
        ("molar mass", f"{number(1e3 * sp.molar_mass, 6)} g/mol"),
    ]
    if sp.molar_volume is not None:
        facts.append(("molar volume", f"{number(1e6 * sp.molar_volume)} cm³/mol"))
    for transition in sp.transitions:
        forms = f" ({transition.from_form} to {transition.to_form})" if transition.to_form else ""
        facts.append(
            (
                "transition",
                f"{transition.T:g} K, {number(transition.latent_heat / 1e3)} kJ/mol{forms}",
            )
        )
    if sp.cas:
        facts.append(("CAS", sp.cas))
    facts += _source("source", sp.source, sp.reference)
    facts += _second(sp)
    others = [name for name in dict.fromkeys(sp.synonyms) if name not in (sp.name, sp.key)]
    if others:
        facts.append(("also called", "; ".join(others)))
    facts += [("remark", flag) for flag in sp.flags]
    width = max(len(name) for name, _ in facts)
    for name, fact in facts:
        out.print(f"  {name:<{width}}  {fact}")


def _kilojoules(joules: float, digits: int) -> str:
    """An enthalpy in kJ/mol; the rounding of an element's zero is not shown."""
    return units.number_text(round(joules / 1e3, 6), digits)


def _h298(sp: Species) -> str:
    h = f"{_kilojoules(sp.h(T_STANDARD), 6)} kJ/mol"
    if sp.h298_uncertainty is None:
        return f"{h}, uncertainty not known"
    u = units.number_text(sp.h298_uncertainty / 1e3, 2)
    kind = f" ({sp.h298_uncertainty_kind})" if sp.h298_uncertainty_kind else ""
    return f"{h}, standard uncertainty {u} kJ/mol{kind}"


def _second(sp: Species) -> list[tuple[str, str]]:
    """The second source, and how far it is from the first where both have data."""
    second = sp.second
    if second is None:
        return [("second source", "none")]
    number = units.number_text
    apart = [
        f"{number(round((g - sp.g(T)) / 1e3, 3), 2)} at {T:g} K"
        for T, g in zip(SECOND_T, second.g, strict=True)
        if g == g  # nan where that source ends
    ]
    facts = _source("second source", second.source, second.reference)
    facts.append(
        (
            "  h, s there",
            f"{_kilojoules(second.h298, 6)} kJ/mol, {number(second.s298, 5)} J/(mol K)",
        )
    )
    if apart:
        facts.append(("  g there - here", ", ".join(apart) + ", kJ/mol"))
    return facts


def _source(label: str, source: str, reference: str) -> list[tuple[str, str]]:
    """The table inside a source, and the full title of the source."""
    facts = [(label, f"{source}: {reference}" if reference else source)]
    about = _sources().get(source)
    if isinstance(about, dict) and "title" in about:
        parts = (about.get("authors"), about["title"], about.get("report"), about.get("year"))
        facts.append(("", ", ".join(str(part) for part in parts if part)))
    return facts


@cache
def _sources() -> dict[str, Any]:
    text = resources.files("species_db").joinpath("data/sources.toml").read_text("utf-8")
    return tomllib.loads(text)


def _list(found: list[Species]) -> Table:
    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False, padding=(0, 1))
    table.add_column("  key", no_wrap=True)
    table.add_column("name")
    table.add_column("phase")
    table.add_column("data, K", justify="right")
    table.add_column("h298, kJ/mol", justify="right")
    table.add_column("source")
    for sp in found:
        table.add_row(
            f"  {sp.key}",
            sp.name,
            sp.phase,
            f"{sp.T_min:g}–{sp.T_max:g}",
            _kilojoules(sp.h(T_STANDARD), 4),
            sp.source,
        )
    return table
