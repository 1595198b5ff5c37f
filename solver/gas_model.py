"""The gas models, by name, with the user's own interaction parameters."""

from __future__ import annotations

import math
from collections.abc import Set
from dataclasses import dataclass

from solver.errors import InputError

GAS_MODELS = {
    "ideal": "ideal gas",
    "srk": "Soave-Redlich-Kwong",
    "pr": "Peng-Robinson",
}
"""The gas models and how they are said."""


@dataclass(frozen=True)
class GasModel:
    """A gas model.

    Attributes
    ----------
    key : str
        ``"ideal"``, ``"srk"`` or ``"pr"``.
    interactions : tuple of (str, str, float)
        Binary interaction parameters k_ij by the keys of two species, over the published ones.

    Raises
    ------
    InputError
        The key is unknown, or an ideal gas is given interaction parameters.
    """

    key: str = "ideal"
    interactions: tuple[tuple[str, str, float], ...] = ()

    def __post_init__(self) -> None:
        if self.key not in GAS_MODELS:
            raise InputError(
                f"The gas model {self.key!r} is not available; choose {', '.join(GAS_MODELS)}.",
                "gas",
                self.key,
                ", ".join(GAS_MODELS),
            )
        for pair in self.interactions:
            _check_pair(pair)
        if self.interactions and self.key == "ideal":
            raise InputError(
                "An ideal gas has no interaction parameters; take them out, or choose srk or pr.",
                "interactions",
                self.interactions,
                "none",
            )

    def among(self, keys: Set[str]) -> tuple[tuple[str, str, float], ...]:
        """The interaction parameters between the given species."""
        return tuple(pair for pair in self.interactions if {pair[0], pair[1]} <= keys)

    @property
    def name(self) -> str:
        """The model in words."""
        return GAS_MODELS[self.key]

    @property
    def is_ideal(self) -> bool:
        """Whether gases mix ideally and have no liquid of their own."""
        return self.key == "ideal"


def _check_pair(pair: object) -> None:
    """Refuse what is no pair of species and a number."""
    if isinstance(pair, tuple | list) and len(pair) == 3:
        a, b, k = pair
        number = isinstance(k, int | float) and not isinstance(k, bool) and math.isfinite(k)
        if isinstance(a, str) and isinstance(b, str) and number:
            return
    raise InputError(
        f"The interaction parameter {pair!r} is not two species and a number; "
        'give it as in ("N2", "H2", 0.07).',
        "interactions",
        pair,
        "(key, key, k_ij)",
    )


def gas_model(gas: str | GasModel) -> GasModel:
    """The model that a name stands for."""
    return gas if isinstance(gas, GasModel) else GasModel(gas)
