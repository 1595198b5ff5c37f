"""Problems as data: candidates and feed by key, numbers in SI, drawn by seed or stored.

A seed gives the same problem as long as the library is the same; what must be kept is stored
by its keys and numbers, never by its seed.
"""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cache
from typing import Any

import numpy as np

import species_db
from species_db import Species

PAIRS = ("T,p", "H,p", "U,V", "T,V", "S,p", "S,V")
COMMON = ("C", "H", "N", "O", "S")
R = 8.314462618


@dataclass(frozen=True)
class Problem:
    """One problem.

    The state held is either given by `values`, or is that of the end state at T and p (or at T
    and V, where the pair holds a volume), with `offset` (J or J/K) added to its energy or entropy.
    Without V the volume is that of the feed as an ideal gas at T and p.
    """

    candidates: tuple[str, ...]
    feed: Mapping[str, float]
    pair: str
    T: float = 0.0
    p: float = 0.0
    V: float = 0.0
    offset: float = 0.0
    values: Mapping[str, float] = field(default_factory=dict)

    @property
    def species(self) -> list[Species]:
        lib = library()
        return [lib[key] for key in self.candidates]

    @property
    def fed(self) -> dict[Species, float]:
        lib = library()
        return {lib[key]: amount for key, amount in self.feed.items()}

    @property
    def volume(self) -> float:
        return self.V or sum(self.feed.values()) * R * self.T / self.p

    def to_json(self) -> str:
        out: dict[str, Any] = {
            "candidates": list(self.candidates),
            "feed": dict(self.feed),
            "pair": self.pair,
        }
        for name in ("T", "p", "V", "offset"):
            if getattr(self, name):
                out[name] = getattr(self, name)
        if self.values:
            out["values"] = dict(self.values)
        return json.dumps(out, ensure_ascii=False)

    @classmethod
    def of(cls, data: Mapping[str, Any]) -> Problem:
        return cls(**{**data, "candidates": tuple(data["candidates"])})


@cache
def library() -> species_db.Library:
    return species_db.load()


@cache
def _pool() -> tuple[list[Species], list[Species], list[str], np.ndarray]:
    """Neutral species and ions by key, elements that have some records, and their weights."""
    everything = [sp for _, sp in sorted((sp.key, sp) for sp in library().values())]
    neutral = [sp for sp in everything if not sp.charge]
    ions = [sp for sp in everything if sp.charge and sp.phase == "gas"]
    counts = Counter(element for sp in neutral for element in sp.elements)
    elements = sorted(element for element, count in counts.items() if count >= 8)
    weight = np.sqrt([counts[element] for element in elements])
    return neutral, ions, elements, weight / weight.sum()


def random_problem(seed: int) -> Problem:
    """1-8 elements, 1-300 candidates, feeds over 14 decades or exact, 200-6000 K, 1e-8-1e3 bar."""
    rng = np.random.default_rng(seed)
    neutral, ions, elements, weight = _pool()
    pool: list[Species] = []
    while not pool:
        count = int(rng.integers(1, 9))
        chosen = {str(e) for e in rng.choice(elements, size=count, replace=False, p=weight)}
        if rng.random() < 0.4:
            chosen |= {str(e) for e in rng.choice(COMMON, size=min(2, count), replace=False)}
        if len(chosen) > 8:
            chosen = set(sorted(chosen)[:8])
        pool = [sp for sp in neutral if set(sp.elements) <= chosen]
    most = max(int(10 ** rng.uniform(0, np.log10(300))), 1)
    species = [pool[i] for i in rng.permutation(len(pool))[:most]]
    if rng.random() < 0.1:  # nothing that evaporates
        species = [sp for sp in species if sp.phase != "gas"] or species
    fed = [species[i] for i in rng.permutation(len(species))[: int(rng.integers(1, 7))]]
    if rng.random() < 0.06:  # a hot gas with ions; the electron is one of them
        species += [sp for sp in ions if set(sp.elements) <= chosen][: 300 - len(species)]
    amounts = _amounts(rng, len(fed))
    T = float(np.exp(rng.uniform(np.log(200.0), np.log(6000.0))))
    p = float(10 ** rng.uniform(-3, 8))
    pair = str(rng.choice(PAIRS))
    offset = 0.0
    if pair[0] in "HUS" and rng.random() < 0.4:
        offset = float(rng.normal()) * 8000.0 * float(sum(amounts))
        if pair[0] == "S":
            offset /= T
    feed = {sp.key: amount for sp, amount in zip(fed, amounts, strict=True)}
    V = 0.0
    if pair.endswith("V") and rng.random() < 0.15:  # a crowded or a very wide vessel
        V = float(sum(amounts)) * R * T / p * float(10 ** rng.uniform(-4, 4))
    return Problem(tuple(sp.key for sp in species), feed, pair, T, p, V, offset)


def _amounts(rng: np.random.Generator, count: int) -> list[float]:
    mode = int(rng.integers(4))
    if mode == 0:
        return [float(x) for x in 10 ** rng.uniform(-14, 0, count)]
    if mode == 1:
        return [float(x) for x in rng.integers(1, 9, count)]
    if mode == 2:  # decimal multiples, exact only until they are added up
        return [round(float(x), 1) for x in rng.integers(1, 40, count) * 0.1]
    return [float(x) for x in 10 ** rng.uniform(-3, 1, count)]
