"""One substance in one state of aggregation, and its cp, h, s and g."""

from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from types import MappingProxyType
from typing import Any, overload

import numpy as np
import numpy.typing as npt

R = 8.314462618
"""Molar gas constant, J/(mol K) (exact since the SI of 2019, to ten digits)."""
T_STANDARD = 298.15
"""Reference temperature of the enthalpies of formation, K."""
P_STANDARD = 1.0e5
"""Standard pressure of every record, Pa."""
SECOND_T = (300.0, 500.0, 1000.0, 2000.0, 3000.0)
"""Temperatures, K, at which a second source's g is kept."""

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Segment:
    """A temperature range with its seven coefficients.

    With t = T in K: cp/R = a1 + a2 t + a3 t^2 + a4 t^3 + a5 t^4,
    h/(RT) = a1 + a2 t/2 + a3 t^2/3 + a4 t^3/4 + a5 t^4/5 + a6/t,
    s/R = a1 ln t + a2 t + a3 t^2/2 + a4 t^3/3 + a5 t^4/4 + a7.
    """

    T_low: float
    T_high: float
    a: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class Transition:
    """A solid-solid transition inside one record.

    T in K; latent_heat in J/mol, taken up on heating; from_form and to_form as the source
    names the two forms (may be empty).
    """

    T: float
    latent_heat: float
    from_form: str = ""
    to_form: str = ""


@dataclass(frozen=True, slots=True)
class SecondSource:
    """What another source says of the same species, kept for comparison.

    h298 in J/mol, s298 in J/(mol K), g in J/mol at the temperatures `SECOND_T` (each nan where
    that source has no data), all at 1 bar and on the same datum.
    """

    source: str
    reference: str
    h298: float
    s298: float
    g: tuple[float, ...]


@dataclass(frozen=True, slots=True, repr=False)
class Species:
    """A record of the library; see the module's functions for units.

    Attributes
    ----------
    key, name : str
    elements : mapping of symbol to atoms per formula unit (read only)
    charge : int
    phase : 'gas', 'liquid' or 'solid'
    segments : contiguous, ordered by temperature
    transitions : solid-solid transitions inside the record, ordered by temperature
    cas, source, reference : str
        Source id (see ``data/sources.toml``) and the table or paper inside it.
    h298_uncertainty : float or None
        Standard (1 sigma) uncertainty of the enthalpy of formation at 298.15 K, J/mol.
    h298_uncertainty_kind : str
        Where it comes from; ``class default`` is a guess by kind of record.
    molar_volume : float or None
        m3/mol at 298 K, condensed species.
    Tc, pc, acentric : float or None
        Critical temperature K, critical pressure Pa, acentric factor.
    second : SecondSource or None
    flags : tuple of str
        Repairs and doubts, in words.
    """

    key: str
    name: str
    elements: Mapping[str, float]
    charge: int
    phase: str
    segments: tuple[Segment, ...]
    molar_mass: float
    transitions: tuple[Transition, ...] = ()
    cas: str = ""
    source: str = "user"
    reference: str = ""
    h298_uncertainty: float | None = None
    h298_uncertainty_kind: str = ""
    synonyms: tuple[str, ...] = ()
    molar_volume: float | None = None
    Tc: float | None = None
    pc: float | None = None
    acentric: float | None = None
    second: SecondSource | None = None
    flags: tuple[str, ...] = ()
    _joins: Array = field(init=False, compare=False)
    _a: Array = field(init=False, compare=False)

    def __post_init__(self) -> None:
        if self.phase not in ("gas", "liquid", "solid"):
            raise ValueError(f"{self.key}: phase {self.phase!r} is not gas, liquid or solid")
        if not self.segments:
            raise ValueError(f"{self.key}: a record needs at least one temperature segment")
        for lower, upper in zip(self.segments, self.segments[1:], strict=False):
            if lower.T_high != upper.T_low:
                raise ValueError(f"{self.key}: temperature segments leave a gap or overlap")
        if any(not 0 < s.T_low < s.T_high or len(s.a) != 7 for s in self.segments):
            raise ValueError(f"{self.key}: a segment needs 0 < T_low < T_high and 7 coefficients")
        joins = np.array([s.T_low for s in self.segments[1:]])
        a = np.array([s.a for s in self.segments])
        joins.flags.writeable = a.flags.writeable = False
        set_once = object.__setattr__
        set_once(self, "elements", MappingProxyType(dict(self.elements)))
        set_once(self, "_joins", joins)
        set_once(self, "_a", a)

    def __hash__(self) -> int:
        return hash(self.key)

    def __repr__(self) -> str:
        return f"<Species {self.key}: {self.name}>"

    def __reduce__(self) -> tuple[Any, ...]:
        values = [getattr(self, f.name) for f in fields(self) if f.init]
        values[2] = dict(self.elements)
        return Species, tuple(values)

    @property
    def T_min(self) -> float:
        """Lowest temperature of the record, K."""
        return self.segments[0].T_low

    @property
    def T_max(self) -> float:
        """Highest temperature of the record, K."""
        return self.segments[-1].T_high

    @overload
    def cp(self, T: float) -> float: ...
    @overload
    def cp(self, T: Array) -> Array: ...
    def cp(self, T: float | Array) -> float | Array:
        """Heat capacity, J/(mol K), at T in K (any shape); constant outside the range."""
        return self._shaped(T, self._cp_h_s(T)[0] * R)

    @overload
    def h(self, T: float) -> float: ...
    @overload
    def h(self, T: Array) -> Array: ...
    def h(self, T: float | Array) -> float | Array:
        """Enthalpy, J/mol, elements at 298.15 K as datum, at T in K (any shape)."""
        return self._shaped(T, self._cp_h_s(T)[1] * R)

    @overload
    def s(self, T: float) -> float: ...
    @overload
    def s(self, T: Array) -> Array: ...
    def s(self, T: float | Array) -> float | Array:
        """Entropy at 1 bar, J/(mol K), at T in K (any shape)."""
        return self._shaped(T, self._cp_h_s(T)[2] * R)

    @overload
    def g(self, T: float) -> float: ...
    @overload
    def g(self, T: Array) -> Array: ...
    def g(self, T: float | Array) -> float | Array:
        """Gibbs energy h - T s at 1 bar, J/mol, at T in K (any shape)."""
        _, h, s = self._cp_h_s(T)
        return self._shaped(T, (h - np.asarray(T, dtype=float) * s) * R)

    @staticmethod
    def _shaped(T: float | Array, value: Array) -> float | Array:
        return float(value) if np.ndim(T) == 0 else value

    def _cp_h_s(self, T: float | Array) -> tuple[Array, Array, Array]:
        """cp/R, h/R and s/R; beyond the range cp is held and h and s follow from it."""
        t_asked = np.asarray(T, dtype=float)
        t = np.minimum(np.maximum(t_asked, self.segments[0].T_low), self.segments[-1].T_high)
        a1, a2, a3, a4, a5, a6, a7 = self._a[np.searchsorted(self._joins, t, side="right")].T
        # .T of an array of shape T.shape + (7,) reverses the axes: turn each one back
        a1, a2, a3, a4, a5, a6, a7 = a1.T, a2.T, a3.T, a4.T, a5.T, a6.T, a7.T
        cp = a1 + t * (a2 + t * (a3 + t * (a4 + t * a5)))
        h = t * (a1 + t * (a2 / 2 + t * (a3 / 3 + t * (a4 / 4 + t * a5 / 5)))) + a6
        s = a1 * np.log(t) + t * (a2 + t * (a3 / 2 + t * (a4 / 3 + t * a5 / 4))) + a7
        return cp, h + cp * (t_asked - t), s + cp * np.log(t_asked / t)
