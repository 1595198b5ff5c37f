"""End states of real mixtures as the doors hand them out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.core.cases import Feed
from solver.core.mixture import R
from solver.endstate import PRESENT, EndState
from solver.errors import NotProven
from solver.fixed import PAIRS, Fixed, Pair
from solver.gas.cautions import cautions
from solver.gas.fluid import make_fluid
from solver.gas_model import GasModel
from solver.posed import Posed
from solver.proof import (
    ELEMENT_LIMIT,
    ENERGY_LIMIT,
    GAP_LIMIT,
    TRACE_LIMIT,
    VOLUME_LIMIT,
    Proof,
    element_residuals,
)
from solver.real.judge import LIQUID, packing
from solver.real.problem import ROOTS, SLOTS, RealCases, RealMixture, make_real
from solver.real.proof import STATIONARITY_LIMIT, RealProof, prove
from solver.real.search import Found, find_states

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_KEPT: dict[tuple[int, GasModel], tuple[Posed, RealMixture]] = {}


def real_mixture(posed: Posed, gas: GasModel) -> RealMixture:
    """The candidates with their equation of state; kept for the next case that asks."""
    key = (id(posed.mixture), gas)
    if key not in _KEPT:
        if len(_KEPT) > 32:
            _KEPT.clear()
        mixture = posed.mixture
        fluid = make_fluid([mixture.species[i] for i in mixture.gas], gas.key, gas.interactions)
        _KEPT[key] = (posed, make_real(mixture, fluid))  # the mixture stays alive, so does its id
    return _KEPT[key][1]


@dataclass(frozen=True)
class Judged:
    """Found states with the figures of their proof, arrays over the cases found."""

    which: Indices
    cases: RealCases
    fluids: Array
    n: Array
    proof: RealProof
    elements: Array
    traces: Array
    energy: Array
    volume: Array

    @property
    def holds(self) -> NDArray[np.bool_]:
        """Which proofs are within their limits."""
        ok = (self.elements <= ELEMENT_LIMIT) & (self.traces <= TRACE_LIMIT)
        ok &= (self.energy <= ENERGY_LIMIT) & (self.volume <= VOLUME_LIMIT)
        ok &= (np.abs(self.proof.gap) <= GAP_LIMIT) & (self.n.min(axis=1) >= 0.0)
        return ok & (self.proof.stationarity <= STATIONARITY_LIMIT)


def judged(
    real: RealMixture, feed: Feed, pair: Pair, first: Array, second: Array, found: Found
) -> Judged:
    """Put what was found to the proof, and the fluid phases into the slots they are called by."""
    which = np.flatnonzero(found.minima.found)
    T, p = found.T[which], found.p[which]
    if found.cases is not None:
        cases = found.cases.of(which)
    else:
        cases = RealCases(real, feed.of(which), T, p)
    fluids, n = found.minima.fluids[which], found.minima.n[which]
    fluids = _named(cases, fluids)
    minima = found.minima
    proof = prove(cases, fluids, n, minima.potentials[which], minima.distance[which])
    elements, traces = element_residuals(real.mixture, n, cases.feed)
    energy = np.zeros(len(which))
    if pair.searched is not None:
        unit = R * n.sum(axis=1) * (1.0 if pair.searched == "S" else T)
        energy = np.abs(found.totals[pair.searched][which] - first[which]) / unit
    volume = np.zeros(len(which))
    if pair.holds_volume:
        held = second[which]
        gone = fluids.sum(axis=(1, 2)) <= 0.0  # condensed phases need not fill a vessel
        volume = np.where(gone, 0.0, np.abs(found.totals["V"][which] - held) / held)
    return Judged(which, cases, fluids, n, proof, elements, traces, energy, volume)


def _named(cases: RealCases, fluids: Array) -> Array:
    """Fluid phases in the slots they are called by, whichever they were found in.

    The gas is what is not a liquid by its density; liquids follow by their amount.
    """
    there = fluids.sum(axis=2) > 0.0
    liquid = there.copy()
    for slot, root in enumerate(ROOTS):
        if not there[:, slot].any():
            continue
        dense, one_root = packing(cases, slice(None), fluids[:, slot], root)
        cold = cases.T < _pseudocritical(cases, fluids[:, slot])
        dense_and_cold = (dense > LIQUID) & cold
        if slot == 0:  # of two roots the vapour's is a gas
            liquid[:, 0] &= dense_and_cold & one_root
        else:
            alone = there.sum(axis=1) == 1
            liquid[:, slot] &= ~(alone & one_root & ~dense_and_cold)
    misplaced = liquid[:, 0] | (there & ~liquid)[:, 1:].any(axis=1) | liquid[:, 2:].any(axis=1)
    out = fluids.copy()
    for case in np.flatnonzero(misplaced):
        out[case] = 0.0
        if (gas := there[case] & ~liquid[case]).any():
            out[case, 0] = fluids[case, gas.argmax()]
        order = sorted(np.flatnonzero(liquid[case]), key=lambda k: -fluids[case, k].sum())
        for slot, found in enumerate(order, start=1):
            if slot < len(SLOTS):
                out[case, slot] = fluids[case, found]
    return out


def _pseudocritical(cases: RealCases, n: Array) -> Array:
    """Mean critical temperature by mole fraction (Kay's rule), K."""
    modelled = cases.fluid.modelled
    part = n[:, modelled]
    with np.errstate(divide="ignore", invalid="ignore"):
        mean = part @ cases.fluid.Tc[modelled] / part.sum(axis=1)
    return np.asarray(np.nan_to_num(mean))


def settle_real(
    posed: Posed, species: Sequence[Species], fixed: Fixed, gas: GasModel, scale: float, feed: Feed
) -> EndState:
    """The end state of one case; raises what the search comes upon."""
    real = real_mixture(posed, gas)
    pair = PAIRS[fixed.pair]
    first = np.array([fixed.values[0] * (1.0 if pair.searched is None else scale)])
    second = np.array([fixed.values[1] * (scale if pair.holds_volume else 1.0)])
    found = find_states(real, feed, pair, first, second, np.zeros((1, 1)))
    if found.why:
        raise found.why[0]
    state = judged(real, feed, pair, first, second, found)
    proof = _proof(state, 0, species, posed, gas)
    if not state.holds[0]:
        raise NotProven(
            f"An end state was found but its proof is not within the limits ({figures(state, 0)}); "
            "it is not shown.",
            "fixed",
            fixed,
        )
    return _end_state(posed, species, fixed, gas, scale, found, state, proof)


def figures(state: Judged, k: int) -> str:
    """The figures of one proof in words."""
    proof = state.proof
    return (
        f"elements {state.elements[k]:.1e}, trace elements {state.traces[k]:.1e}, "
        f"energy {state.energy[k]:.1e}, volume {state.volume[k]:.1e}, "
        f"stationarity {proof.stationarity[k]:.1e}, tangent plane {proof.distance[k]:.1e}, "
        f"gap {proof.gap[k]:.1e}"
    )


def _proof(state: Judged, k: int, species: Sequence[Species], posed: Posed, gas: GasModel) -> Proof:
    mixture, force = posed.mixture, state.proof.force[k]
    left_out = {mixture.species[i].key for i in state.cases.real.stands_for}
    absent = {sp.key: 0.0 for sp in species if sp.phase != "gas" and sp.key not in left_out}
    for sp, amount, f in zip(mixture.species, state.n[k], force, strict=True):
        if sp.key in absent:
            if amount > 0.0:
                del absent[sp.key]
            else:
                absent[sp.key] = float(np.exp(min(f, 0.0)))
    return Proof(
        element_residual=float(state.elements[k]),
        trace_residual=float(state.traces[k]),
        energy_residual=float(state.energy[k]),
        gap=float(state.proof.gap[k]),
        absent=MappingProxyType(absent),
        model=_model(gas, state),
        stationarity=float(state.proof.stationarity[k]),
        tangent_distance=float(state.proof.distance[k]),
        starts=state.proof.starts,
    )


def _model(gas: GasModel, state: Judged) -> str:
    fluid, real = state.cases.fluid, state.cases.real
    species = real.mixture.species
    pairs = ", ".join(f"{pair.a}-{pair.b} {pair.k:g}" for pair in fluid.k)
    text = (
        f"{gas.name} equation of state with van der Waals mixing for gas and fluid liquid; "
        + (f"k_ij {pairs}; all others zero. " if pairs else "every k_ij zero. ")
        + "Each other condensed species a pure phase of constant molar volume v, "
        "which counts in V and as v (p - 1 bar) in its Gibbs energy. "
        "No better state was found by the tangent-plane test; that is no rigorous bound."
    )
    if real.stands_for:
        names = ", ".join(species[i].key for i in real.stands_for)
        text += (
            f" Left out: {names}; the liquid of the equation of state holds that substance, "
            "dissolved gases and pressure included, and would count it twice."
        )
    return text


def _below_freezing(real: RealMixture, liquid: Array, T: float) -> list[str]:
    """Substances in a fluid liquid colder than their own liquid's record begins."""
    species = real.mixture.species
    held = dict(zip(real.mixture.gas.tolist(), liquid.tolist(), strict=True))
    least = 1e-3 * float(liquid.sum())
    cold = [
        f"{species[own].key} ({species[own].T_min:.5g} K)"
        for own, gas in real.stands_for.items()
        if held[gas] > least and T < species[own].T_min - 0.05
    ]
    if not cold:
        return []
    return [
        f"At {T:.4g} K the liquid is colder than the data of {', '.join(cold)} begin: it may "
        "freeze, and a cubic equation of state can miss a freezing point by tens of K."
    ]


def _end_state(
    posed: Posed,
    species: Sequence[Species],
    fixed: Fixed,
    gas: GasModel,
    scale: float,
    found: Found,
    state: Judged,
    proof: Proof,
) -> EndState:
    mixture, n = posed.mixture, state.n[0]
    T, p = float(state.cases.T[0]), float(state.cases.p[0])
    gases = [mixture.species[i].key for i in mixture.gas]
    fluids: dict[str, Mapping[str, float]] = {}
    for name, amounts in zip(SLOTS, state.fluids[0], strict=True):
        if amounts.sum() > 0.0:
            held: dict[str, float] = {}
            for key, amount in zip(gases, amounts, strict=True):
                held[key] = held.get(key, 0.0) + float(amount / scale)
            fluids[name] = MappingProxyType(held)
    amounts_by_key = {sp.key: 0.0 for sp in species}
    for sp, amount in zip(mixture.species, n, strict=True):
        amounts_by_key[sp.key] += float(amount / scale)
    named = n > PRESENT * n.sum()
    outside = named & ((mixture.thermo.T_min > T) | (mixture.thermo.T_max < T))
    said: list[str] = []
    for slot in range(len(SLOTS)):
        if state.fluids[0, slot].sum() > 0.0:
            said += cautions(state.cases.fluid, T, p, state.fluids[0, slot])
    real = state.cases.real
    said += _below_freezing(real, state.fluids[0, 1:].sum(axis=0), T)
    total = {name: float(values[0] / scale) for name, values in found.totals.items()}
    if PAIRS[fixed.pair].holds_volume:
        total["V"] = fixed.values[1]
    return EndState(
        T=T,
        p=p,
        V=total["V"],
        H=total["H"],
        U=total["U"],
        S=total["S"],
        G=total["G"],
        amounts=MappingProxyType(amounts_by_key),
        species=tuple(species),
        fixed=fixed,
        gas=gas.key,
        proof=proof,
        outside_range=tuple(mixture.species[i].key for i in np.flatnonzero(outside)),
        fluids=MappingProxyType(fluids),
        left_out=MappingProxyType(
            {mixture.species[a].key: mixture.species[b].key for a, b in real.stands_for.items()}
        ),
        taken_as_ideal=real.fluid.not_modelled,
        cautions=tuple(dict.fromkeys(said)),
        model=gas,
    )
