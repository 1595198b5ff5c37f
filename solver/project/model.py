"""The project as the engineer wrote it: frozen, in the units that were typed.

Nothing here computes. `solver.project.case` turns a `Case` into what the solver takes,
`solver.project.file` reads and writes the whole. Numbers and units stay as typed so that a
project opens the way it was left, even while it is incomplete or wrong.
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field, Strict

PairName = Literal["T,p", "H,p", "U,V", "T,V", "S,p", "S,V"]
Variable = Literal["T", "p", "V", "H", "U", "S"]
PhaseName = Literal["gas", "liquid", "solid"]
GasName = Literal["ideal", "srk", "pr"]

Number = Annotated[float, Strict()] | str
"""A number, or the text that could not be read as one ("" while nothing is typed yet)."""


class _Frozen(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)


class Quantity(_Frozen):
    """A number with the unit it was typed in.

    `value` is a float wherever the text could be read. Text that could not be read is kept as
    it stands, so that nothing typed is lost; settling then names the field.
    """

    value: Number
    unit: str


class Amount(_Frozen):
    """How much of one species a stream holds.

    `species` is a key, a name, a synonym or a formula, as typed. `unit` is an amount (mol, kmol,
    kg, g, Nm3, m3), a flow (kmol/h, kg/h, Nm3/h, m3/h) or a share of the stream's total
    ("mol %", "mass %"). A row without species and without number counts as not written.
    """

    species: str
    value: Number
    unit: str


class Stream(_Frozen):
    """A feed with its own temperature and pressure."""

    name: str
    T: Quantity
    p: Quantity
    amounts: tuple[Amount, ...] = ()
    total: Quantity | None = None
    """What the shares are shares of; used only where an amount is in %."""


class FixedPair(_Frozen):
    """The two state variables held, and the heat that crosses the wall.

    A variable of the pair that `values` does not name is taken as fed: H, U, S and V are the
    sums over the streams as they enter; T and p are those of the streams where all agree.
    Values of variables outside the pair are kept but not used, so that a change of pair and
    back loses nothing; so is heat where the pair holds no energy.
    """

    pair: PairName = "T,p"
    values: dict[Variable, Quantity] = Field(default_factory=dict)
    heat: Quantity | None = None
    """Heat added to the mixture (negative when lost); pairs with H or U only."""


class Candidates(_Frozen):
    """Which species may be present at the end.

    "short" is the short list of `solver.project.candidates.SHORT_RULE`, "all" every neutral
    species made of the elements, "listed" none but those of `added`. Additions and exclusions
    are keys, names or formulas and apply to every rule; exclusions win.
    """

    rule: Literal["short", "all", "listed"] = "short"
    elements: tuple[str, ...] | None = None
    """None: the elements of the streams."""
    phases: tuple[PhaseName, ...] = ("gas", "liquid", "solid")
    added: tuple[str, ...] = ()
    excluded: tuple[str, ...] = ()


class InertPart(_Frozen):
    """A fed species, or a part of it, that takes no part in any reaction.

    `part` is a share of what is fed ("%") or an amount (on a flow basis a flow). None or empty
    text: the whole, which then is neither used up nor formed.
    """

    kind: Literal["inert"] = "inert"
    species: str = ""
    part: Quantity | None = None


class HeldConversion(_Frozen):
    """A fed species of which a given share, in %, is used up: no more and no less."""

    kind: Literal["conversion"] = "conversion"
    species: str = ""
    conversion: Quantity = Quantity(value="", unit="%")


class HeldApproach(_Frozen):
    """A reaction whose equilibrium constant is taken at T + dT.

    dT is negative for an endothermic reaction that stays behind, such as methane reforming, and
    positive for an exothermic one. `key` names the species of the reaction that carries the
    shift; empty text leaves the choice to the solver.
    """

    kind: Literal["approach"] = "approach"
    reaction: str = ""
    dT: Quantity = Quantity(value="", unit="K")
    key: str = ""


class SeparateGroup(_Frozen):
    """Species that exchange no element with the others."""

    kind: Literal["no exchange"] = "no exchange"
    species: tuple[str, ...] = ()


Restriction = Annotated[
    InertPart | HeldConversion | HeldApproach | SeparateGroup, Field(discriminator="kind")
]
"""What keeps a mixture short of full equilibrium; an empty one counts as not written."""


class Interaction(_Frozen):
    """A binary interaction parameter k_ij of one's own, over the published ones.

    `a` and `b` are gas species as typed, `k` a number. One with nothing in it counts as not
    written; all are kept, but not used, while the gas is ideal.
    """

    a: str = ""
    b: str = ""
    k: Number = ""


class TemperaturePlot(_Frozen):
    """The range of the composition plot; no part of the answer."""

    T_from: Quantity = Quantity(value=300, unit="degC")
    T_to: Quantity = Quantity(value=1200, unit="degC")
    logarithmic: bool = False


class Case(_Frozen):
    """One question: what goes in, what is held, what may form."""

    name: str = "Case 1"
    streams: tuple[Stream, ...] = ()
    fixed: FixedPair = FixedPair()
    candidates: Candidates = Candidates()
    restrictions: tuple[Restriction, ...] = ()
    reactions: tuple[str, ...] = ()
    """The engineer's own reaction set, for the view of reactions; empty: one is chosen."""
    gas: GasName = "ideal"
    """The gas model: ideal, Soave-Redlich-Kwong or Peng-Robinson."""
    interactions: tuple[Interaction, ...] = ()
    plot: TemperaturePlot = TemperaturePlot()
    notes: str = ""


class Project(_Frozen):
    """All that one file holds."""

    title: str = ""
    notes: str = ""
    cases: tuple[Case, ...] = Field(default=(Case(),), min_length=1)
