"""Where a cubic equation of state is not good, said of one state.

The thresholds are common practice, no source.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from solver.gas.equation import FADES_BELOW
from solver.gas.fluid import Fluid

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]

SEEN: Final = 0.01  # mole fraction from which a component is spoken of
MAIN: Final = 0.05  # mole fraction from which a component shapes the mixture
QUANTUM: Final = frozenset({"H2", "D2", "HD", "He", "Ne"})
QUANTUM_COLD: Final = 2.5  # T/Tc
POLAR: Final = frozenset({"H2O", "NH3", "HF", "HCN", "N2H4", "H2O2", "NH2OH"})
POLAR_NAME: Final = re.compile(r"(?<!thi)(?<!nitroglycer)ol$| alcohol$| acid$|glycol$|amine$")
DENSE: Final = 0.7  # density over the critical one
COMPRESSED: Final = 2.5  # density over the critical one
HIGH_PRESSURE: Final = 1.0e8  # Pa
NEAR_T: Final = 0.05  # distance from the critical point, as a fraction
NEAR_P: Final = 0.2


def cautions(fluid: Fluid, T: float, p: float, n: Array) -> tuple[str, ...]:
    """Sentences on what the equation of state is worth at this state; none if nothing stands out.

    Parameters
    ----------
    T, p : K, Pa
    n : (S,), mol, amounts of one phase in the order of fluid.species
    """
    amount = float(n.sum())
    if amount <= 0.0:
        return ()
    y = n / amount
    said = (
        _not_modelled(fluid, y),
        _quantum(fluid, T, y),
        _no_attraction(fluid, T, y),
        *_density(fluid, T, p, y),
        _near_critical(fluid, T, p, y),
    )
    return tuple(sentence for sentence in said if sentence)


def _not_modelled(fluid: Fluid, y: Array) -> str:
    found = _listed(fluid.species, (~fluid.modelled) & (y > SEEN))
    if not found:
        return ""
    return f"No usable critical constants: {found} taken as ideal in the mixture."


def _quantum(fluid: Fluid, T: float, y: Array) -> str:
    kind = np.array([sp.key in QUANTUM for sp in fluid.species], dtype=bool)
    found = _listed(fluid.species, kind & fluid.modelled & (y > SEEN) & _below(fluid.Tc, T))
    if not found:
        return ""
    return (
        f"At {T:.4g} K quantum effects count for {found}; the equation of state has none of them."
    )


def _below(Tc: Array, T: float) -> NDArray[np.bool_]:
    return np.asarray(QUANTUM_COLD * np.nan_to_num(Tc) > T)


def _no_attraction(fluid: Fluid, T: float, y: Array) -> str:
    real = fluid.modelled
    gone = np.zeros(real.size, dtype=bool)
    slope = fluid.equation.m(fluid.acentric[real])
    gone[real] = fluid.equation.root_alpha(np.array(T), fluid.Tc[real], slope)[0] < FADES_BELOW
    found = _listed(fluid.species, gone & (y > MAIN))
    if not found:
        return ""
    return (
        f"At {T:.4g} K the attraction of {found} has faded out in the equation of state; what is "
        "left is the volume of the molecules."
    )


def _density(fluid: Fluid, T: float, p: float, y: Array) -> tuple[str, ...]:
    moments = fluid.at(np.array([T]), np.array([p]))
    M = np.einsum("s,csm->cm", y, moments.q)
    if M[0, 0] <= 0.0:
        return ()
    Z = fluid.residual(M, "least").Z[0]
    equation = fluid.equation
    # covolume over volume, as a multiple of what the equation has at its critical point
    critical = equation.omega_b / _critical_Z(fluid)
    density = float(M[0, 1] / M[0, 0] / Z / critical)
    said = []
    if density > DENSE:
        polar = np.array([_is_polar(sp) for sp in fluid.species], dtype=bool)
        found = _listed(fluid.species, polar & (y > MAIN))
        if found:
            said.append(
                f"Dense phase with {found}: a cubic equation of state does not describe hydrogen "
                "bonds; its volume and fugacities may be off by tens of "
                "per cent, what gas dissolves in it by a factor of ten."
            )
    if density > COMPRESSED or p > HIGH_PRESSURE:
        said.append(
            f"At {p / 1e5:.4g} bar the phase has {density:.2g} times its critical density; the "
            "volume from a cubic equation of state may be off by 5 to 20 per cent or more."
        )
    return tuple(said)


def _critical_Z(fluid: Fluid) -> float:
    """Compressibility factor at the critical point: the three roots of the cubic are one."""
    equation = fluid.equation
    return (1.0 - (equation.d1 + equation.d2 - 1.0) * equation.omega_b) / 3.0


def _is_polar(sp: Species) -> bool:
    return sp.key in POLAR or bool(POLAR_NAME.search(sp.name))


def _near_critical(fluid: Fluid, T: float, p: float, y: Array) -> str:
    """Nearness to the pseudocritical point, the mean by mole fraction (W. B. Kay, 1936)."""
    real = fluid.modelled
    share = y[real].sum()
    if share <= 0.0:
        return ""
    Tc = float(y[real] @ fluid.Tc[real] / share)
    pc = float(y[real] @ fluid.pc[real] / share)
    if abs(T / Tc - 1.0) > NEAR_T or abs(p / pc - 1.0) > NEAR_P:
        return ""
    return (
        f"Near the critical point (about {Tc:.4g} K, {pc / 1e5:.3g} bar by the mean of the "
        "components): densities and heat capacities are poor there, and the split into phases "
        "is uncertain."
    )


def _listed(species: Sequence[Species], which: NDArray[np.bool_]) -> str:
    return ", ".join(sp.key for sp, yes in zip(species, which, strict=True) if yes)
