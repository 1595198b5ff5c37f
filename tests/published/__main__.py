"""Print how far each published value is off, the worst first: `python -m tests.published`."""

from __future__ import annotations

from rich.console import Console
from rich.table import Table

from tests.published.evaluate import EVALUATORS, Deviation, ammonia, deviation, rows


def main() -> None:
    """Evaluate every row and print the table."""
    found: list[Deviation] = []
    console = Console(width=170)
    for row in (row for table in EVALUATORS for row in rows(table)):
        try:
            found.append(deviation(row))
        except Exception as error:
            console.print(f"{row.table}.csv:{row.line} {row.name}: {error!r}", style="red")
    table = Table("value", "published", "own", "tolerance", "used", "source", box=None)
    for one in sorted(found, key=lambda one: -one.used):
        cells = one.row.cells
        unit = cells.get("unit", "").replace("1", "")
        table.add_row(
            one.row.name,
            f"{cells['value']} {unit}",
            f"{one.own:.5g}",
            cells["tolerance"],
            f"{one.used:.2f}",
            cells["source"][:50],
        )
    console.print(table)
    outside = sum(one.used > 1 for one in found)
    console.print(f"{len(found)} values, {outside} outside their tolerance")
    console.print(ammonia_by_model())


def ammonia_by_model() -> Table:
    """Yield of ammonia less the published one, by gas model, mol %."""
    by_conditions: dict[str, dict[str, Deviation]] = {}
    models: list[str] = []
    for row in ammonia():
        conditions, _, model = row.cells["held"].partition("; gas=")
        by_conditions.setdefault(conditions, {})[model] = deviation(row)
        models += [model] if model not in models else []
    table = Table(
        "ammonia from 3 H2 + N2",
        "published, mol %",
        "tolerance",
        *models,
        title="Deviation in mol % by gas model; * outside the tolerance",
        box=None,
    )
    for conditions, found in by_conditions.items():
        cells = next(iter(found.values())).row.cells
        off = [
            f"{one.own - one.row.value:+.2f}{'*' if one.used > 1 else ''}" for one in found.values()
        ]
        mark = " (extrapolated)" if "extrapolated" in cells["source"] else ""
        table.add_row(conditions + mark, cells["value"], cells["tolerance"], *off)
    return table


if __name__ == "__main__":
    main()
