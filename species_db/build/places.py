"""Where the packages that carry the sources keep their files, and small readers for them."""

import csv
import math
from functools import cache
from importlib.util import find_spec
from pathlib import Path

DATA = Path(__file__).resolve().parent.parent / "data"
HERE = Path(__file__).resolve().parent


@cache
def package_dir(name: str) -> Path:
    """Folder of an installed package, without importing it."""
    spec = find_spec(name)
    if spec is None or spec.origin is None:
        raise SystemExit(f"the build reads the package {name!r}: install it first")
    return Path(spec.origin).parent


@cache
def chemicals_rows(path: str) -> tuple[dict[str, str], ...]:
    """Rows of a tab-separated table of the package ``chemicals``."""
    with (package_dir("chemicals") / path).open(encoding="utf-8", newline="") as f:
        return tuple(csv.DictReader(f, delimiter="\t"))


def number(text: str | None) -> float:
    """A cell as a float, nan if it is empty or no number."""
    try:
        return float(text) if text else math.nan
    except ValueError:
        return math.nan


def cas_from_digits(digits: str) -> str:
    """``"7732185" -> "7732-18-5"``."""
    n = str(int(digits))
    return f"{n[:-3]}-{n[-3:-1]}-{n[-1]}"


def cas_ok(cas: str) -> bool:
    """Whether the check digit of a CAS registry number is right."""
    parts = cas.split("-")
    if len(parts) != 3 or not all(p.isdigit() for p in parts) or len(parts[2]) != 1:
        return False
    digits = (parts[0] + parts[1])[::-1]
    return sum((i + 1) * int(d) for i, d in enumerate(digits)) % 10 == int(parts[2])
