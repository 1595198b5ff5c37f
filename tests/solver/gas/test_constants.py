"""Critical constants: used, refused or missing."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from solver.errors import InputError
from solver.gas.constants import LIMITS, critical_constants
from tests.solver.gas.states import fluid_of, library


@pytest.mark.parametrize(
    ("field", "value"),
    [
        ("Tc", 0.0), ("Tc", -5.0), ("Tc", 3500.0), ("Tc", float("nan")), ("Tc", float("inf")),
        ("pc", 0.0), ("pc", -1e5), ("pc", 2e8), ("pc", float("nan")),
        ("acentric", -0.7), ("acentric", 2.5), ("acentric", float("nan")),
    ],
)  # fmt: skip
def test_absurd_constants_of_the_users_own(field: str, value: float):
    own = replace(library()["CO2"], source="user", **{field: value})
    with pytest.raises(InputError) as caught:
        critical_constants([library()["N2"], own])
    assert caught.value.field == f"species[CO2].{field}"
    assert caught.value.value is value
    assert "CO2" in str(caught.value)
    assert field in str(caught.value)
    assert caught.value.allowed.startswith("above")


def test_limits_themselves():
    for field, (_, high, _) in LIMITS.items():
        own = replace(library()["CO2"], source="user", **{field: high})
        assert critical_constants([own]).modelled.all()


def test_missing_ones_are_ideal_and_named():
    own = replace(library()["CO2"], source="user", acentric=None)
    constants = critical_constants([own, library()["N2"], library()["OH"]])
    assert constants.modelled.tolist() == [False, True, False]
    assert constants.known.tolist() == [False, True, False]
    assert fluid_of(("CO2", "OH", "N2", "CH3"), "pr").not_modelled == ("OH", "CH3")


def test_ions_and_lone_atoms_are_not_modelled():
    """Whoever gives them constants."""
    ion = replace(library()["CO2"], source="user", charge=1)
    atom = replace(library()["O"], source="user", Tc=100.0, pc=4e6, acentric=0.01)
    constants = critical_constants([ion, atom, library()["Ar"]])
    assert constants.known.all()
    assert constants.modelled.tolist() == [False, False, True]


def test_every_shipped_record_is_judged():
    """No ion, no lone atom but the noble gases, nothing outside the limits, no placeholder."""
    gases = [sp for sp in library().values() if sp.phase == "gas"]
    constants = critical_constants(gases)
    real = constants.modelled
    assert real.sum() > 750
    for sp, is_real, known in zip(gases, real, constants.known, strict=True):
        assert known or not is_real
        if is_real:
            assert sp.charge == 0
            assert sum(sp.elements.values()) > 1 or sp.key in ("He", "Ne", "Ar", "Kr", "Xe", "Rn")
    assert np.all((constants.Tc[real] > 3.0) & (constants.Tc[real] <= 1000.0))
    assert np.all((constants.pc[real] > 1e5) & (constants.pc[real] < 3e7))
    assert np.all((constants.acentric[real] > -0.4) & (constants.acentric[real] < 1.6))
    left_out = {
        sp.key for sp, a, b in zip(gases, constants.known, real, strict=True) if a and not b
    }
    assert {"P", "S", "KI", "PbCl2", "C6H11F"} <= left_out
    assert not {"H2O", "NH3", "H2", "He", "SO3", "Br2"} & left_out
    for name in (constants.Tc, constants.pc, constants.acentric):
        assert np.isfinite(name[constants.known]).all()


def test_arrays_are_read_only():
    fluid = fluid_of(("CO2", "N2"), "pr")
    for array in (fluid.Tc, fluid.pc, fluid.acentric, fluid.b, fluid.modelled, fluid.weights):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 0
