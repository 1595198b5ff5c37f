"""Random batches, settled at once and one by one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

import solver
from solver.fixed import PAIRS as KNOWN
from species_db import Species
from tests.fuzz.problems import R, random_problem

SAME_AMOUNT, SAME_T = 1e-9, 1e-10


@dataclass(frozen=True)
class Batch:
    """Candidates, feeds (each an array) and the two values of the pair, SI."""

    species: list[Species]
    feeds: dict[Species, np.ndarray]
    pair: str
    X: np.ndarray
    Y: np.ndarray

    def __len__(self) -> int:
        return len(self.X)

    def feed(self, i: int) -> dict[Species, float]:
        return {sp: float(amounts[i]) for sp, amounts in self.feeds.items()}

    def fixed(self, i: int) -> solver.Fixed:
        first, second = KNOWN[self.pair].variables
        return solver.Fixed(self.pair, **{first: self.X[i], second: self.Y[i]})

    def of(self, cases: np.ndarray) -> Batch:
        feeds = {sp: amounts[cases] for sp, amounts in self.feeds.items()}
        return Batch(self.species, feeds, self.pair, self.X[cases], self.Y[cases])

    def scaled(self, factor: float) -> Batch:
        """All amounts, and what goes with them, a number of times larger."""
        feeds = {sp: amounts * factor for sp, amounts in self.feeds.items()}
        first, second = KNOWN[self.pair].variables
        X = self.X if first == "T" else self.X * factor
        Y = self.Y if second == "p" else self.Y * factor
        return Batch(self.species, feeds, self.pair, X, Y)

    def settle(self) -> solver.EndStates:
        return solver.settle_many(self.species, self.feeds, self.pair, self.X, self.Y)


def random_batch(seed: int, count: int) -> Batch:
    """A line in temperature or cases in any order, over the candidates of a random problem.

    Energies and entropies are those of a mixture at random temperatures as computed case by
    case, some far out of reach; the range of temperatures lets condensed phases come and go.
    """
    rng = np.random.default_rng(seed)
    problem = random_problem(seed)
    species, fed = problem.species, problem.fed
    pair = KNOWN[problem.pair]
    line = rng.random() < 0.5
    T = np.linspace(300.0, 3500.0, count) if line else rng.uniform(250.0, 4000.0, count)
    p = np.full(count, problem.p) if line else problem.p * 10 ** rng.uniform(-1, 1, count)
    share = np.ones(count) if line else 10 ** rng.uniform(-1, 1, count)
    feeds = {
        sp: amount * (share if k == 0 else np.ones(count))
        for k, (sp, amount) in enumerate(fed.items())
    }
    if not line and len(feeds) > 1:  # some cases lack one of the fed species
        feeds[list(feeds)[-1]][rng.random(count) < 0.2] = 0.0
    Y = p
    if pair.holds_volume:
        Y = sum(feeds.values()) * R * T / p if not line else np.full(count, problem.volume)
    batch = Batch(species, feeds, "T,V" if pair.holds_volume else "T,p", T, Y)
    if pair.searched is None:
        return batch
    X = np.zeros(count)
    for i in range(count):
        try:
            X[i] = getattr(solver.settle(species, batch.feed(i), batch.fixed(i)), pair.searched)
        except solver.SettleError:
            X[i] = 0.0
    far = rng.random(count) < 0.05
    return Batch(species, feeds, problem.pair, np.where(far, X - 1e9, X), Y)


def differences(batch: Batch, ends: solver.EndStates, cases: range | None = None) -> list[str]:
    """What the batch has otherwise than the cases by themselves."""
    out = []
    for i in cases if cases is not None else range(len(batch)):
        try:
            end = solver.settle(batch.species, batch.feed(i), batch.fixed(i))
        except solver.SettleError as error:
            if ends.settled[i]:
                out.append(f"case {i} is settled in the batch alone; by itself: {error}")
            elif i not in ends.why:
                out.append(f"case {i} is not settled and no reason is given")
            continue
        if not ends.settled[i]:
            out.append(f"case {i} is settled by itself alone; in the batch: {ends.why.get(i)}")
            continue
        if abs(ends.T[i] / end.T - 1.0) > SAME_T:
            out.append(f"case {i}: T is {ends.T[i]!r} in the batch, {end.T!r} by itself")
        n = np.array([end.amounts[key] for key in ends.keys])
        off = np.abs(n - ends.amounts[i]).max() / n.sum()
        if off > SAME_AMOUNT:
            key = ends.keys[int(np.abs(n - ends.amounts[i]).argmax())]
            out.append(f"case {i}: the amount of {key} differs by {off:.1e} of all, T = {end.T}")
        for name in ("p", "V", "H", "S"):
            one, many = getattr(end, name), getattr(ends, name)[i]
            if abs(one - many) > 1e-8 * max(
                abs(one), R * n.sum() * (end.T if name == "H" else 1.0)
            ):
                out.append(f"case {i}: {name} is {many} in the batch, {one} by itself")
    return out
