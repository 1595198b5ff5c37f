"""A published minimum whose data are published with it, so that only the minimiser is tested.

Hydrazine burnt with oxygen at 3500 K and 51 atm: W. B. White, S. M. Johnson, G. B. Dantzig,
J. Chem. Phys. 28 (1958) 751; objective to ten digits from J. Bracken, G. P. McCormick, Selected
Applications of Nonlinear Programming, 1968, p. 46. A later collection (W. Hock, K. Schittkowski,
1981, problem 112) prints another point, which is feasible but no minimum; it is checked as such.
`given_data.csv` holds g/RT at the pressure of the problem and the published amounts.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

import solver
from species_db import R, Segment, Species

T = 3500.0
BALANCE = {"H": 2.0, "N": 1.0, "O": 1.0}
MINIMUM = -47.76109086

with (Path(__file__).parent / "given_data.csv").open(newline="", encoding="utf-8") as file:
    ROWS = list(csv.DictReader(file))

AMOUNTS = np.array([float(row["n"]) for row in ROWS])
G = np.array([float(row["g"]) for row in ROWS])


def constant(key: str, elements: dict[str, float], g_RT: float) -> Species:
    """A gas whose g/RT is the given number at T: cp of 4 R, h zero at T, s by difference."""
    cp = 4.0
    h = -cp * T
    s = -g_RT - cp * np.log(T)
    segment = Segment(200.0, 6000.0, (cp, 0.0, 0.0, 0.0, 0.0, h, float(s)))
    return Species(
        key=key,
        name=key,
        elements=elements,
        charge=0,
        phase="gas",
        segments=(segment,),
        molar_mass=1e-3,
    )


def gas() -> list[Species]:
    return [
        constant(
            row["species"],
            {e: float(row[e]) for e in BALANCE if float(row[e])},
            float(row["g"]),
        )
        for row in ROWS
    ]


@pytest.fixture(scope="module")
def end() -> solver.EndState:
    hydrazine = constant("N2H4", {"N": 2.0, "H": 4.0}, 0.0)
    oxygen = constant("fed O2", {"O": 2.0}, 0.0)
    fixed = solver.Fixed("T,p", T=T, p=1e5)
    return solver.settle(gas(), {hydrazine: 0.5, oxygen: 0.5}, fixed)


def objective(n: np.ndarray) -> float:
    return float(n @ (G + np.log(n / n.sum())))


def test_the_data_are_as_given():
    given = [species.g(T) / (R * T) for species in gas()]
    assert given == pytest.approx(list(G), abs=1e-12)


def test_minimum_to_all_published_digits(end: solver.EndState):
    n = np.array([end.amounts[row["species"]] for row in ROWS])
    assert objective(n) == pytest.approx(MINIMUM, abs=1e-6)
    assert end.G / (R * T) == pytest.approx(MINIMUM, abs=1e-6)
    assert n.sum() == pytest.approx(1.6384381, abs=1e-5)


@pytest.mark.parametrize("row", ROWS, ids=lambda row: row["species"])
def test_amount(end: solver.EndState, row: dict[str, str]):
    assert end.amounts[row["species"]] == pytest.approx(
        float(row["n"]), abs=float(row["tolerance"])
    )


def test_the_later_print_is_no_minimum(end: solver.EndState):
    printed = -47.707579
    assert end.G / (R * T) < printed - 0.05
