"""Writes the tables of ``species_db/data``."""

import csv
import math
from collections import Counter
from pathlib import Path

from species_db.build.draft import Draft, LeftOut
from species_db.build.poly import g_at
from species_db.loader import COLUMNS
from species_db.species import SECOND_T, R

DIGITS = 12


def species_table(drafts: list[Draft], named: set[str], path: Path) -> None:
    """One row a record, sorted by state, elements and key."""
    order = {"gas": 0, "liquid": 1, "solid": 2}
    rows = sorted(
        drafts, key=lambda d: (order[d.phase], d.charge != 0, sorted(d.elements), d.atoms, d.key)
    )
    with path.open("w", encoding="utf-8", newline="\n") as f:
        f.write("\t".join(COLUMNS) + "\n")
        for d in rows:
            f.write("\t".join(_cells(d, named)) + "\n")


def _cells(d: Draft, named: set[str]) -> list[str]:
    critical = d.critical or (math.nan, math.nan, math.nan)
    means = ("f" if d.usual else "") + ("n" if d.key in named else "")
    cells = {
        "key": d.key,
        "name": d.name,
        "elements": " ".join(f"{e}:{n:g}" for e, n in d.elements.items()),
        "charge": str(d.charge),
        "phase": d.phase,
        "means": means,
        "synonyms": "|".join(d.synonyms),
        "cas": d.cas,
        "source": d.source,
        "reference": d.reference,
        "u_h298": _short(d.u),
        "u_kind": d.u_kind,
        "molar_volume": _short(d.molar_volume),
        "Tc": _short(critical[0]),
        "pc": _short(critical[1]),
        "acentric": _short(critical[2]),
        "transitions": "|".join(
            f"{m.T:.8g} {m.heat:.8g} {m.lower.replace(' ', '_')} {m.upper.replace(' ', '_')}"
            for m in d.moves
        ),
        "second": _second(d.second),
        "flags": "|".join(dict.fromkeys(d.flags)),
        "segments": "|".join(
            f"{p.low:.8g} {p.high:.8g} " + " ".join(f"{x:.{DIGITS}g}" for x in p.a)
            for p in d.pieces
        ),
    }
    return [" ".join(cells[c].split()) for c in COLUMNS]


def _short(x: float) -> str:
    return "" if math.isnan(x) else f"{x:.6g}"


def _second(s: Draft | None) -> str:
    if s is None:
        return ""
    g = [
        f"{g_at(s.pieces, t) * R * t:.7g}" if s.T_min - 2 <= t <= s.T_max else "" for t in SECOND_T
    ]
    at_298 = [f"{s.h298:.7g}", f"{s.s298:.6g}"] if s.T_min < 300 else ["nan", "nan"]
    return ";".join([s.source, s.reference.replace(";", ","), *at_298, *g])


def counts_table(drafts: list[Draft], reasons: Counter[str], path: Path) -> None:
    """How many records were kept, by source and state, and left out, by reason."""
    kept = Counter((d.source, "ion" if d.charge else d.phase) for d in drafts)
    with path.open("w", encoding="utf-8", newline="") as f:
        w = csv.writer(f, lineterminator="\n")
        w.writerow(["what", "which", "records"])
        w.writerows(("kept", f"{source} {state}", n) for (source, state), n in sorted(kept.items()))
        w.writerows(("left out", reason, n) for reason, n in sorted(reasons.items()))


def left_out_table(out: list[LeftOut], path: Path) -> Counter[str]:
    """What was left out and why; returns the count of each reason."""
    rows = sorted(set(out), key=lambda x: (x.source, x.reason, x.record))
    with path.open("w", encoding="utf-8", newline="") as f:
        w = csv.writer(f, lineterminator="\n")
        w.writerow(["source", "record", "name", "phase", "reason"])
        w.writerows((x.source, x.record, x.name, x.phase, x.reason) for x in rows)
    return Counter(x.reason for x in rows)
