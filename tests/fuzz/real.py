"""Random real mixtures: settled at T and p, then found again from another pair.

The problems are those of an engineer with bad luck: any substances of a few elements, most of
them with critical constants, cold enough to condense into several liquids, dense enough to be
far from ideal, beside solids and pure liquids of the library.
"""

from __future__ import annotations

import json
import sys
import warnings
from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

import solver
from species_db import Species
from tests.fuzz.problems import PAIRS, library

ELEMENTS = (
    "C H O", "C H O N", "H N", "H O", "C H", "C H O S", "H O N", "C O", "C H O N S", "H Cl O",
    "C H Cl", "N O", "C H O Ca", "H O Na Cl",
)  # fmt: skip

NAMED: list[dict[str, Any]] = json.loads(
    (Path(__file__).parent / "named_real.json").read_text("utf-8")
)
"""Problems that once failed, by what was wrong."""


@dataclass(frozen=True)
class RealProblem:
    """Candidates, feed in mol, and the state at which they are settled first."""

    species: tuple[Species, ...]
    feed: dict[Species, float]
    pair: str
    T: float
    p: float
    gas: str


def real_problem(seed: int) -> RealProblem:
    """1 to 60 candidates, 200 to 1500 K, 0.01 to 1000 bar, any pair, either equation of state."""
    rng = np.random.default_rng(seed)
    lib = library()
    elements = set(str(ELEMENTS[rng.integers(len(ELEMENTS))]).split())
    known = [sp for sp in lib.values() if not sp.charge and set(sp.elements) <= elements]
    gases = [sp for sp in known if sp.phase == "gas" and sp.Tc]
    chosen = [
        gases[i] for i in rng.permutation(len(gases))[: max(int(10 ** rng.uniform(0, 1.6)), 1)]
    ]
    count = int(10 ** rng.uniform(0, 1.3)) - 1
    others = [known[i] for i in rng.permutation(len(known))[:count]]
    liquids = [lib[f"{sp.key}(l)"] for sp in chosen if f"{sp.key}(l)" in lib and rng.random() < 0.5]
    species = list({sp.key: sp for sp in (*chosen, *others, *liquids)}.values())
    fed = [species[i] for i in rng.permutation(len(species))[: int(rng.integers(1, 5))]]
    if rng.random() < 0.7:
        amounts = 10 ** rng.uniform(-3, 1, len(fed))
    else:
        amounts = rng.integers(1, 6, len(fed)).astype(float)
    T = float(np.exp(rng.uniform(np.log(200.0), np.log(1500.0))))
    p = float(10 ** rng.uniform(3, 8))
    pair = str(rng.choice(PAIRS))
    gas = str(rng.choice(["srk", "pr"]))
    feed = {sp: float(amount) for sp, amount in zip(fed, amounts, strict=True)}
    return RealProblem(tuple(species), feed, pair, T, p, gas)


def named_problem(data: Mapping[str, Any]) -> RealProblem:
    """A problem stored by its keys and numbers."""
    lib = library()
    feed = {lib[key]: amount for key, amount in data["feed"].items()}
    species = tuple(lib[key] for key in data["candidates"])
    return RealProblem(species, feed, data["pair"], data["T"], data["p"], data["gas"])


def judge_real(problem: RealProblem) -> str:
    """What became of it: the phases, or a sentence that begins with "failed"."""
    species = list(problem.species)
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            fixed = solver.Fixed("T,p", T=problem.T, p=problem.p)
            first = solver.settle(species, problem.feed, fixed, gas=problem.gas)
            second = first
            if problem.pair != "T,p":
                values = {name: getattr(first, name) for name in problem.pair.split(",")}
                fixed = solver.Fixed(problem.pair, **values)
                second = solver.settle(species, problem.feed, fixed, gas=problem.gas)
    except solver.InputError:
        return "refused"
    except Exception as error:  # whatever it is, an engineer must not see it
        return f"failed: {type(error).__name__}: {error}"
    for end in (first, second):
        if not end.proof.holds:
            return "failed: a state without proof"
    if abs(second.T / first.T - 1.0) > 1e-8:
        return f"failed: {problem.pair} ends at {second.T!r} K, not at {first.T!r} K"
    # without a gas the pressure follows from a compressibility of 1e-9 / Pa, or from nothing
    if "gas" in first.phases and abs(second.p / first.p - 1.0) > 1e-7:
        return f"failed: {problem.pair} ends at {second.p!r} Pa, not at {first.p!r} Pa"
    return " and ".join(sorted({_kind(name) for name in second.phases}))


def _kind(phase: str) -> str:
    return phase if phase in ("gas", "liquid", "second liquid", "third liquid") else "condensed"


def main(first: int, count: int) -> int:
    """Judge many; prints the failures, then how many came to what."""
    found: Counter[str] = Counter()
    named = [(data["why"], named_problem(data)) for data in NAMED]
    seeded = ((str(seed), real_problem(seed)) for seed in range(first, first + count))
    for name, problem in (*named, *seeded):
        verdict = judge_real(problem)
        found[verdict.partition(":")[0]] += 1
        if verdict.startswith("failed"):
            print(name, verdict, flush=True)
    for kind, number in found.most_common():
        print(f"{number:6d} {kind}")
    return 1 if found["failed"] else 0


if __name__ == "__main__":
    sys.exit(main(*(int(text) for text in sys.argv[1:3])))
