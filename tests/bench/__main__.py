"""`make bench`: run the benchmarks and write the table of ratios to notes.md beside this file."""

from __future__ import annotations

import json
import platform
import sys
import tempfile
from datetime import UTC, datetime
from importlib.metadata import version
from pathlib import Path

import pytest

HERE = Path(__file__).parent


def main() -> int:
    """Run, then write; the exit code is pytest's."""
    with tempfile.TemporaryDirectory() as folder:
        out = Path(folder) / "bench.json"
        code = pytest.main(
            [str(HERE), "-q", "--benchmark-only", "--benchmark-sort=mean",
             "--benchmark-columns=min,median,mean,rounds", f"--benchmark-json={out}"]
        )  # fmt: skip
        if code == 0:
            (HERE / "notes.md").write_text(notes(json.loads(out.read_text())), "utf-8")
            print(f"wrote {HERE / 'notes.md'}")
    return int(code)


def notes(found: dict) -> str:
    """The table: times of one run, each beside Thalweg's on the same problem."""
    runs = {one["name"]: one for one in found["benchmarks"]}
    lines = [
        "# Speed",
        "",
        "Written by `make bench`; all figures come from one run on one machine. The problem "
        "is a reforming gas of 68 C-H-O-N species at 1150 K and 2 bar, cold start. The general "
        "solvers get exact derivatives and ready-made matrices, and only their solving is timed; "
        "Thalweg's time is that of the whole call, species data and proof included. Times drift "
        "with the machine; each ratio is the median of rounds in which both take turns.",
        "",
        f"{datetime.now(UTC):%Y-%m-%d}, Python {platform.python_version()}, "
        + ", ".join(f"{p} {version(p)}" for p in ("numpy", "scipy", "clarabel", "casadi")),
        "",
        "| problem | solver | fastest, ms | median, ms | over Thalweg's "
        "| above minimum, G/nRT | balance off |",
        "| --- | --- | ---: | ---: | ---: | ---: | ---: |",
    ]
    for problem in ("gas", "gas and graphite"):
        base = None
        for solver in ("Thalweg", "Clarabel", "IPOPT", "SLSQP"):
            one = next(
                run for run in runs.values()
                if run["params"] and run["params"].get("name") == solver
                and run["params"].get("with_graphite") is (problem != "gas")
            )  # fmt: skip
            fastest, median = (one["stats"][kind] * 1e3 for kind in ("min", "median"))
            base = base or fastest
            extra = one["extra_info"]
            ratio = extra.get("over Thalweg", fastest / base)
            lines.append(
                f"| {problem} | {solver} | {fastest:.3g} | {median:.3g} | {ratio:.3g} "
                f"| {extra['missed']:.0e} | {extra['balance']:.0e} |"
            )
    lines += ["", "| same gas with graphite, fed at 700 K | fastest, ms | median, ms | over T,p |"]
    lines += ["| --- | ---: | ---: | ---: |"]
    for pair in ("H,p", "U,V"):
        one = runs[f"test_settle_energy[{pair}]"]
        stats, ratio = one["stats"], one["extra_info"]["over T,p"]
        lines.append(
            f"| {pair} | {stats['min'] * 1e3:.3g} | {stats['median'] * 1e3:.3g} | {ratio:.3g} |"
        )
    lines += [
        "",
        "A thousand cases in one call of `settle_many`, unordered or along a line of "
        "temperatures; then Clarabel's time for one of them over ours, and ours over the "
        "unordered cases at T,p.",
        "",
        "| mixture | cases | fastest, us a case | median, us a case | Clarabel over Thalweg "
        "| over T,p |",
        "| --- | --- | ---: | ---: | ---: | ---: |",
    ]
    for problem in ("gas", "gas and graphite"):
        for kind in ("T,p", "T,p line", "H,p", "U,V"):
            one = runs[f"test_settle_many[{kind}-{problem}]"]
            stats, extra = one["stats"], one["extra_info"]
            lines.append(
                f"| {problem} | {kind} | {stats['min'] * 1e3:.3g} | {stats['median'] * 1e3:.3g} "
                f"| {extra['Clarabel over']:.3g} | {extra['over T,p']:.3g} |"
            )
    lines += [
        "",
        "The same gas by an equation of state, at T and p.",
        "",
        "| mixture | cases | gas model | fastest, ms | median, ms | real over ideal |",
        "| --- | --- | --- | ---: | ---: | ---: |",
    ]
    for problem in ("gas", "gas and graphite"):
        for cases, name in (("one", "test_settle_real"), ("1000", "test_settle_many_real")):
            for gas in ("srk", "pr"):
                one = runs[f"{name}[{gas}-{problem}]"]
                stats, ratio = one["stats"], one["extra_info"]["over ideal"]
                lines.append(
                    f"| {problem} | {cases} | {gas} | {stats['min'] * 1e3:.3g} "
                    f"| {stats['median'] * 1e3:.3g} | {ratio:.3g} |"
                )
    lines += ["", "| candidates of C, H, O, N, S | one cold case, fastest, ms |", "| ---: | ---: |"]
    for name, run in runs.items():
        if name.startswith("test_growth"):
            lines.append(f"| {run['params']['count']} | {run['stats']['min'] * 1e3:.3g} |")
    return "\n".join(lines) + "\n"


if __name__ == "__main__":
    sys.exit(main())
