"""Print how far each published value is off, the worst first: `python -m tests.published`."""

from __future__ import annotations

from rich.console import Console
from rich.table import Table

from tests.published.evaluate import EVALUATORS, Deviation, deviation, rows


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


if __name__ == "__main__":
    main()
