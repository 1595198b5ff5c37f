"""Flashes of what cannot react, as the property package `thermo` does them with the same equation.

Constants and k_ij are handed over, so that nothing but the phase split is compared.
"""

from __future__ import annotations

import numpy as np
import pytest
from thermo import (
    CEOSGas,
    CEOSLiquid,
    ChemicalConstantsPackage,
    FlashVL,
    HeatCapacityGas,
    PropertyCorrelationsPackage,
)
from thermo.eos_mix import PRMIX, SRKMIX

import solver
from solver.gas.fluid import make_fluid
from tests.solver.mixtures import library

PEER = {"srk": SRKMIX, "pr": PRMIX}

# Balances alone fix how much there is of each species.
BINARY = {
    "CH4 C3H8": [(0.6, 230.0, 1.5e6), (0.4, 277.0, 4.0e6), (0.7, 200.0, 3.0e6), (0.5, 300.0, 8e6)],
    "CO2 CH3OH": [(0.5, 298.0, 2.0e6), (0.8, 313.0, 5.0e6), (0.3, 370.0, 1.0e6)],
    "CO2 H2O": [(0.5, 350.0, 5.0e6), (0.2, 450.0, 2.0e6)],
    "H2 H2O": [(0.7, 430.0, 6.0e6), (0.9, 400.0, 2.0e6)],
    "N2 NH3": [(0.4, 270.0, 5.0e6), (0.7, 320.0, 1.0e7)],
}
CASES = [(keys, *state) for keys, states in BINARY.items() for state in states]


def peer_flash(gas: solver.GasModel, keys: list[str], z: list[float], T: float, p: float):
    fluid = make_fluid([library()[key] for key in keys], gas.key, gas.interactions)
    size = len(keys)
    k = np.zeros((size, size))
    for pair in fluid.k:
        i, j = keys.index(pair.a), keys.index(pair.b)
        k[i, j] = k[j, i] = pair.k
    critical = {"Tcs": list(fluid.Tc), "Pcs": list(fluid.pc), "omegas": list(fluid.acentric)}
    species = [library()[key] for key in keys]
    constants = ChemicalConstantsPackage(**critical, MWs=[1e3 * s.molar_mass for s in species])
    # a flash at T and p needs no heat capacity, but the package asks for one
    heat = [HeatCapacityGas(poly_fit=(50.0, 2000.0, [30.0])) for _ in keys]
    properties = PropertyCorrelationsPackage(constants, HeatCapacityGases=heat, skip_missing=True)
    eos = {**critical, "kijs": k.tolist()}
    phases = [
        phase(PEER[gas.key], eos, HeatCapacityGases=heat, T=T, P=p, zs=z)
        for phase in (CEOSGas, CEOSLiquid)
    ]
    return FlashVL(constants, properties, gas=phases[0], liquid=phases[1]).flash(T=T, P=p, zs=z)


@pytest.mark.parametrize("key", ["srk", "pr"])
@pytest.mark.parametrize(("keys", "share", "T", "p"), CASES)
def test_flash_of_two(key: str, keys: str, share: float, T: float, p: float):
    compare(solver.GasModel(key), keys.split(), [share, 1.0 - share], T, p)


@pytest.mark.parametrize("key", ["srk", "pr"])
def test_flash_with_interactions_of_the_users_own(key: str):
    model = solver.GasModel(key, (("CH4", "C3H8", 0.09),))
    own = compare(model, ["CH4", "C3H8"], [0.6, 0.4], 230.0, 1.5e6)
    table = compare(solver.GasModel(key), ["CH4", "C3H8"], [0.6, 0.4], 230.0, 1.5e6)
    assert abs(own.fraction("CH4", "liquid") - table.fraction("CH4", "liquid")) > 1e-3


def compare(
    model: solver.GasModel, keys: list[str], z: list[float], T: float, p: float
) -> solver.EndState:
    """Which phases there are, their compositions and sizes to 1e-6, their volume to 1e-6."""
    theirs = peer_flash(model, keys, z, T, p)
    species = [library()[key] for key in keys]
    ours = solver.settle(
        species, dict(zip(species, z, strict=True)), solver.Fixed("T,p", T=T, p=p), gas=model
    )
    for key, amount in zip(keys, z, strict=True):
        assert ours.amounts[key] == pytest.approx(amount, rel=1e-12)
    assert len(ours.fluids) == theirs.phase_count
    volume = 0.0
    liquid = getattr(theirs, "liquid0", None)  # there is no such name where there is none
    for name, phase in (("gas", theirs.gas), ("liquid", liquid)):
        if phase is None:
            continue
        if theirs.phase_count == 2:
            for key, y in zip(keys, phase.zs, strict=True):
                assert ours.fraction(key, name) == pytest.approx(y, abs=1e-6)
            assert ours.phase_amounts[name] == pytest.approx(phase.beta, abs=1e-6)
        volume += phase.beta * phase.V()
    assert ours.V == pytest.approx(volume, rel=2e-6)
    return ours
