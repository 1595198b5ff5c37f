"""The files of the library: sources named, what was left out accounted for, quick to load."""

import csv
import subprocess
import sys
from collections import Counter
from pathlib import Path

import species_db

DATA = Path(species_db.__file__).parent / "data"
LOAD = """
import time
begin = time.perf_counter()
import numpy
middle = time.perf_counter()
import species_db
lib = species_db.load()
lib["CO2"]
print((time.perf_counter() - middle) / (middle - begin))
"""


def test_loads_in_a_moment():
    """Import and load cost no more than numpy's own import does, in the best of five runs."""
    command = [sys.executable, "-c", LOAD]
    runs = [
        float(subprocess.run(command, capture_output=True, text=True, check=True).stdout)
        for _ in range(5)
    ]
    assert min(runs) < 1.0


def test_every_source_id_is_described(records):
    assert {s.source for s in records} <= set(species_db.sources())
    for entry in species_db.sources().values():
        assert entry["title"]


def test_counts_agree_with_the_tables(records):
    with (DATA / "counts.csv").open(encoding="utf-8") as f:
        rows = list(csv.DictReader(f))
    kept = Counter({r["which"]: int(r["records"]) for r in rows if r["what"] == "kept"})
    assert kept == Counter(f"{s.source} {'ion' if s.charge else s.phase}" for s in records)
    with (DATA / "left_out.csv").open(encoding="utf-8") as f:
        out = list(csv.DictReader(f))
    assert all(row["reason"] and row["record"] for row in out)
    left = {r["which"]: int(r["records"]) for r in rows if r["what"] == "left out"}
    assert left == Counter(row["reason"] for row in out)


def test_notice_credits_every_carrier():
    text = (DATA / "NOTICE").read_text("utf-8")
    for word in ("thermochem", "janaf", "chemicals", "Active Thermochemical Tables", "CRC"):
        assert word in text
    root = DATA.parents[1] / "NOTICE"
    if root.exists():
        assert root.read_text("utf-8") == text


def test_the_running_library_needs_numpy_alone():
    code = (
        "import sys, species_db; species_db.load()['CO2'].g(1000.0); "
        "names = ('chemicals', 'janaf', 'thermochem', 'scipy', 'pandas'); "
        "print([m for m in names if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
