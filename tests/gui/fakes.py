"""Answers made up for tests that must not depend on the solver's speed."""

import threading
from dataclasses import dataclass, field
from types import SimpleNamespace

from solver.gas_model import GasModel
from species_db import Segment, Species


def gas(key, elements, molar_mass=0.028):
    segment = Segment(200.0, 6000.0, (3.5, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0))
    return Species(key, key.lower(), elements, 0, "gas", (segment,), molar_mass)


def condensed(key, elements, molar_mass=0.012):
    segment = Segment(200.0, 6000.0, (3.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0))
    return Species(key, key.lower(), elements, 0, "solid", (segment,), molar_mass)


H2 = gas("H2", {"H": 2}, 0.002)
N2 = gas("N2", {"N": 2}, 0.028)
GRAPHITE = condensed("C(gr)", {"C": 1})


def answer(amounts=None, T=1500.0, absent=None):
    """A CaseAnswer in shape, from amounts by key."""
    species = (H2, N2, GRAPHITE)
    amounts = {"H2": 1.0, "N2": 3.0, "C(gr)": 0.0} | (amounts or {})
    phases = {"gas": {key: amounts[key] for key in ("H2", "N2")}}
    if amounts["C(gr)"]:
        phases["C(gr)"] = {"C(gr)": amounts["C(gr)"]}
    proof = SimpleNamespace(
        element_residual=1e-16,
        trace_residual=1e-15,
        energy_residual=0.0,
        gap=3e-12,
        absent={"C(gr)": 0.83} if absent is None else absent,
        model="Ideal gas mixture.",
        rigorous=True,
    )
    end = SimpleNamespace(
        T=T,
        p=1e5,
        V=0.5,
        H=-1e5,
        U=-1.1e5,
        S=2e3,
        G=-3e6,
        amounts=amounts,
        species=species,
        phases=phases,
        phase_amounts={name: sum(held.values()) for name, held in phases.items()},
        fluids={},
        left_out={},
        taken_as_ideal=(),
        cautions=(),
        proof=proof,
        outside_range=(),
        fixed=SimpleNamespace(pair="T,p"),
    )
    fed = SimpleNamespace(T=298.15, p=1e5, V=0.1, H=-2e5, U=-2e5, S=1e3, mass=0.1, amount=4.0)
    prepared = SimpleNamespace(
        feed={H2: 1.0, N2: 3.0},
        candidates=species,
        fixed=end.fixed,
        fed=fed,
        gas=GasModel(),
        basis="batch",
        restrictions=(),
        reactions=(),
    )
    return SimpleNamespace(
        end=end, fed=fed, heat=1e5, basis="batch", prepared=prepared, messages=()
    )


@dataclass
class SlowSettle:
    """Counts its calls; each waits until `gate` opens."""

    gate: threading.Event = field(default_factory=threading.Event)
    cases: list = field(default_factory=list)

    def __call__(self, case):
        self.cases.append(case)
        self.gate.wait(10)
        return answer(T=float(case.fixed.values["T"].value))
