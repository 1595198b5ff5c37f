"""Invented cases that the tests of the window start from."""

from solver.project.model import (
    Amount,
    Candidates,
    Case,
    FixedPair,
    Project,
    Quantity,
    Stream,
)


def q(value, unit):
    return Quantity(value=value, unit=unit)


def burner(**changes):
    """Methane and air at 1500 K, a batch in mol."""
    fuel = Stream(
        name="fuel",
        T=q(25, "degC"),
        p=q(1, "bar"),
        amounts=(Amount(species="CH4", value=1.0, unit="mol"),),
    )
    air = Stream(
        name="air",
        T=q(25, "degC"),
        p=q(1, "bar"),
        amounts=(
            Amount(species="O2", value=2.0, unit="mol"),
            Amount(species="N2", value=7.52, unit="mol"),
        ),
    )
    case = Case(
        name="burner",
        streams=(fuel, air),
        fixed=FixedPair(pair="T,p", values={"T": q(1500, "K"), "p": q(1, "bar")}),
        candidates=Candidates(
            rule="listed",
            added=("CH4", "O2", "N2", "CO", "CO2", "H2", "H2O", "OH", "NO", "H", "O", "C(gr)"),
        ),
    )
    return case.model_copy(update=changes)


def project(*cases):
    return Project(title="trial", cases=cases)
