"""Binary interaction parameters k_ij: the published table, and what the user puts over it."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from math import isfinite

from solver.errors import InputError


@dataclass(frozen=True)
class Pair:
    """One k_ij in use: species keys in the order of the candidates, value, where it is from."""

    a: str
    b: str
    k: float
    source: str


@cache
def published(equation_key: str) -> dict[frozenset[str], Pair]:
    """The shipped table of one equation of state."""
    text = (files("solver.gas") / "interactions.csv").read_text("utf-8")
    rows = csv.DictReader(line for line in text.splitlines() if not line.startswith("#"))
    return {
        frozenset((row["a"], row["b"])): Pair(row["a"], row["b"], float(row["k"]), row["source"])
        for row in rows
        if row["equation"] == equation_key
    }


def pairs_in_use(
    modelled: Sequence[str],
    equation_key: str,
    own: Iterable[tuple[str, str, float]] = (),
) -> tuple[Pair, ...]:
    """Pairs among the modelled candidates with a known k_ij, the user's own over the table.

    Parameters
    ----------
    modelled : keys of the candidates the equation of state describes
    equation_key : "srk" or "pr"
    own : (key, key, k) triples

    Raises
    ------
    InputError
        For |k| > 1, a pair of a species with itself, a pair given twice with two values, and a
        key that is no modelled candidate.
    """
    order = {key: i for i, key in enumerate(modelled)}
    found = {
        names: pair for names, pair in published(equation_key).items() if names <= order.keys()
    }
    given: dict[frozenset[str], float] = {}
    for a, b, k in own:
        for key in (a, b):
            if key not in order:
                raise InputError(
                    f"interaction of {a} with {b}: {key} is not among the gas candidates that "
                    "the equation of state describes; make it a candidate with critical "
                    "constants, or take the pair out",
                    field="interactions",
                    value=key,
                    allowed=", ".join(modelled) or "no pair at all",
                )
        if a == b:
            raise InputError(
                f"interaction of {a} with itself: a pair needs two species; take it out",
                field="interactions",
                value=(a, b, k),
                allowed="two different species",
            )
        if not isfinite(k) or abs(k) > 1.0:
            raise InputError(
                f"interaction of {a} with {b}: k = {k:g} is outside -1 to 1; published values "
                "lie mostly between -0.2 and 0.6",
                field="interactions",
                value=k,
                allowed="-1 to 1",
            )
        names = frozenset((a, b))
        if given.setdefault(names, float(k)) != float(k):
            raise InputError(
                f"interaction of {a} with {b} is given as {given[names]:g} and as {k:g}; "
                "keep one of them",
                field="interactions",
                value=(given[names], k),
                allowed="one value for a pair",
            )
    for names, k in given.items():
        a, b = names
        found[names] = Pair(a, b, k, "given by the user")
    in_order = (
        pair if order[pair.a] < order[pair.b] else Pair(pair.b, pair.a, pair.k, pair.source)
        for pair in found.values()
    )
    return tuple(sorted(in_order, key=lambda pair: (order[pair.a], order[pair.b])))
