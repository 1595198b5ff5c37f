"""Random restrictions on random problems, and whether what is restricted holds."""

from __future__ import annotations

import warnings
from dataclasses import dataclass

import numpy as np
from scipy.optimize import linprog

import solver
from solver.reactions import reactions_at
from species_db import Species
from tests.fuzz.judge import Fault, Verdict, balances, closure
from tests.fuzz.problems import R, random_problem

HELD = 1e-9  # of the amount, or of ln K


@dataclass(frozen=True)
class Restricted:
    species: list[Species]
    feed: dict[Species, float]
    fixed: solver.Fixed
    restrictions: tuple[solver.restrictions.Restriction, ...]


def random_restricted(seed: int) -> Restricted | None:
    """At T,p of a random problem: inert parts, conversions, approaches, groups."""
    rng = np.random.default_rng(seed)
    problem = random_problem(seed)
    feed = {sp: x for sp, x in problem.fed.items() if x > 1e-3 * max(problem.feed.values())}
    species = problem.species[:25]
    species += [sp for sp in feed if sp not in species]
    if not feed or any(sp.charge for sp in species):
        return None
    fixed = solver.Fixed("T,p", T=problem.T, p=problem.p)
    chosen: list[solver.restrictions.Restriction] = []
    for sp in feed:
        kind = rng.integers(5)
        if kind == 0:
            chosen.append(solver.Inert(sp.key))
        elif kind == 1:
            chosen.append(solver.Inert(sp.key, share=float(rng.random())))
        elif kind == 2:
            part = float(rng.random()) * feed[sp]
            chosen.append(solver.Inert(sp.key, amount=part))
        elif kind == 3:
            chosen.append(solver.FixedConversion(sp.key, float(rng.choice([0, 0.1, 0.5, 0.9]))))
    if rng.random() < 0.3 and len(species) > 3:
        some = [species[i].key for i in rng.permutation(len(species))[: len(species) // 2]]
        chosen = [solver.NoExchange(some)]
    if rng.random() < 0.4:
        try:
            end = solver.settle(species, feed, fixed)
            found = reactions_at(end, feed).figures
        except solver.SettleError:
            return None
        if found:
            reaction = found[int(rng.integers(len(found)))].reaction
            held = solver.HeldApproach(reaction, float(rng.uniform(-100.0, 100.0)))
            in_it = {sp.key for sp in reaction.numbers}
            beside = [
                r
                for r in chosen
                if (isinstance(r, solver.Inert) and not r.whole)
                or (isinstance(r, solver.FixedConversion) and r.species not in in_it)
            ]
            chosen = [held, *beside] if rng.random() < 0.5 else [held]
    return Restricted(species, feed, fixed, tuple(chosen)) if chosen else None


def judge_restricted(case: Restricted) -> Verdict:
    """Settle it and check balances, proof, what is restricted, and the costs."""
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            return _judged(case)
    except Fault as fault:
        return Verdict("failed", str(fault))
    except Exception as error:
        return Verdict("failed", f"{type(error).__name__}: {error}")


def _judged(case: Restricted) -> Verdict:
    try:
        end = solver.settle(case.species, case.feed, case.fixed, restrictions=case.restrictions)
    except (solver.InputError, solver.NoEndState) as error:
        if error.field == "species" and obeyed_by_some(case):
            raise Fault(f"some amounts obey the restrictions, yet: {error}") from None
        return Verdict("refused", str(error))
    n = np.array([end.amounts[sp.key] for sp in case.species])
    if (n < 0.0).any():
        raise Fault("an amount is negative")
    elements, traces = closure(n, case.species, case.feed)
    if elements > 1e-12 or traces > 1e-9:
        raise Fault(f"element residual {elements:.1e}, of traces {traces:.1e}")
    if not end.proof.holds:
        raise Fault("the proof does not hold")
    fed = {sp.key: x for sp, x in case.feed.items()}
    for r in case.restrictions:
        if isinstance(r, solver.Inert):
            amount = end.amounts[r.species]
            if r.whole and abs(amount - fed[r.species]) > HELD * fed[r.species]:
                raise Fault(f"{r}, yet {amount} of {fed[r.species]} mol are left")
            part = r.amount if r.share is None else r.share * fed[r.species]
            if not r.whole and amount < (part or 0.0) * (1.0 - HELD):
                raise Fault(f"{r}, yet {amount} of {fed[r.species]} mol are left")
        elif isinstance(r, solver.FixedConversion):
            left = fed[r.species] * (1.0 - r.conversion)
            if abs(end.amounts[r.species] - left) > HELD * fed[r.species]:
                raise Fault(f"{r}, yet {end.amounts[r.species]} mol are left, not {left}")
        elif isinstance(r, solver.HeldApproach):
            check_approach(end, r, case)
        else:
            check_group(end, r, case)
    for cost in end.proof.restrictions:
        scale = 1e-9 * R * end.T * n.sum() + 1e-13 * abs(end.G)
        if cost.energy < -scale:
            raise Fault(f"{cost.restriction} costs {cost.energy} J")
    return Verdict("settled", "", elements, traces, 0.0, end.proof.gap)


def obeyed_by_some(case: Restricted) -> bool:
    """Whether any amounts hold the feed and obey all restrictions, by a linear program."""
    species, feed = case.species, case.feed
    bounds: dict[str, tuple[float, float | None]] = {sp.key: (0.0, None) for sp in species}
    fed = {sp.key: x for sp, x in feed.items()}
    groups = [frozenset(sp.key for sp in species)]
    for r in case.restrictions:
        if isinstance(r, solver.Inert):
            part = fed[r.species] if r.whole else r.amount or (r.share or 0.0) * fed[r.species]
            bounds[r.species] = (part, part if r.whole else None)
        elif isinstance(r, solver.FixedConversion):
            left = fed[r.species] * (1.0 - r.conversion)
            bounds[r.species] = (left, left)
        elif isinstance(r, solver.NoExchange):
            groups = [r.species, groups[0] - r.species]
    size = max(fed.values())
    rows = sorted({e for sp in (*species, *feed) for e in sp.elements})
    blocks, totals = [], []
    for group in groups:
        inside = np.array([sp.key in group for sp in species], dtype=float)
        own = {sp: x for sp, x in feed.items() if sp.key in group}
        A, b = balances(species, own, rows)
        blocks.append((A * inside[:, None]).T)
        totals.append(b / size)
    found = linprog(
        np.zeros(len(species)),
        A_eq=np.concatenate(blocks),
        b_eq=np.concatenate(totals),
        bounds=[tuple(x if x is None else x / size for x in bounds[sp.key]) for sp in species],
    )
    return bool(found.status == 0)


def check_approach(end: solver.EndState, held: solver.HeldApproach, case: Restricted) -> None:
    """Q of the reaction is K at the shifted temperature, where all of its species are present."""
    amounts, log_q, log_k, T = dict(end.amounts), 0.0, 0.0, end.T + held.dT
    if T < 1.0:
        return
    fed = {sp.key: x for sp, x in case.feed.items()}
    inert = 0.0
    for r in case.restrictions:
        if isinstance(r, solver.Inert):  # the inert part dilutes, but does not react
            part = r.amount if r.amount is not None else (r.share or 0.0) * fed[r.species]
            if amounts[r.species] - part <= 1e-6 * part:
                return  # too little of the rest to be told from rounding
            amounts[r.species] -= part
            if next(sp for sp in end.species if sp.key == r.species).phase == "gas":
                inert += part
    N = inert + sum(amounts[sp.key] for sp in end.species if sp.phase == "gas")
    for sp, nu in held.reaction.numbers.items():
        x = amounts[sp.key]
        if x <= 1e-290:
            return
        if sp.phase == "gas":
            log_q += float(nu) * np.log(x / N * end.p / 1e5)
        else:
            # the pressure upon the phase counts at the temperature reached
            log_q += float(nu) * (sp.molar_volume or 0.0) * (end.p - 1e5) / (R * end.T)
        log_k -= float(nu) * float(sp.g(T)) / (R * T)
    if abs(log_q - log_k) > 1e-7 * (1.0 + abs(log_k)):
        raise Fault(f"{held}: ln Q is {log_q}, ln K {log_k}")


def check_group(end: solver.EndState, group: solver.NoExchange, case: Restricted) -> None:
    """The elements of the group are those fed into it."""
    inside = [sp for sp in case.species if sp.key in group.species]
    for element in {e for sp in inside for e in sp.elements}:
        after = sum(end.amounts[sp.key] * sp.elements.get(element, 0.0) for sp in inside)
        before = sum(
            x * sp.elements.get(element, 0.0)
            for sp, x in case.feed.items()
            if sp.key in group.species
        )
        if abs(after - before) > 1e-9 * max(after, before):
            raise Fault(f"the group held {before} mol of {element}, now {after}")
