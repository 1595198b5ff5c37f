"""The gas models, by name, with the user's own interaction parameters."""

from __future__ import annotations

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
        if self.interactions and self.key == "ideal":
            raise InputError(
                "An ideal gas has no interaction parameters; take them out, or choose srk or pr.",
                "interactions",
                self.interactions,
                "none",
            )

    @property
    def name(self) -> str:
        """The model in words."""
        return GAS_MODELS[self.key]

    @property
    def is_ideal(self) -> bool:
        """Whether gases mix ideally and have no liquid of their own."""
        return self.key == "ideal"


def gas_model(gas: str | GasModel) -> GasModel:
    """The model that a name stands for."""
    return gas if isinstance(gas, GasModel) else GasModel(gas)
