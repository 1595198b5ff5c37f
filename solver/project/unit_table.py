"""The units an engineer types most, as an exact table.

The table answers without loading pint (0.3 s), so that reading a field costs microseconds.
Every factor is checked against pint in the tests; a unit that is not here is looked up there.
Conversion to SI is ``value * factor + offset``.

Definitions: BIPM, The International System of Units, 9th edition (bar, litre, hour, degree
Celsius); NIST Special Publication 811 (2008), appendix B (atm, torr, psi, calorie, Btu, pound,
degree Fahrenheit, horsepower). The normal cubic metre is the ideal-gas amount at 0 degC and
101325 Pa (DIN 1343), the standard cubic metre that at 15 degC and 101325 Pa (ISO 13443), the
standard cubic foot that at 60 degF and 14.696 psi (American gas trade); all three from memory.
Gauge pressure counts from the standard atmosphere, 101325 Pa.
"""

from __future__ import annotations

from typing import Final, NamedTuple

ATMOSPHERE: Final = 101325.0
"""Pa, the zero of gauge pressure."""
R: Final = 8.31446261815324
"""J/(mol K), exact in the SI."""
NORMAL_MOLES: Final = ATMOSPHERE / (R * 273.15)
"""mol in one normal cubic metre of an ideal gas."""
STANDARD_MOLES: Final = ATMOSPHERE / (R * 288.15)
"""mol in one standard cubic metre of an ideal gas."""
_PSI = 0.45359237 * 9.80665 / 0.0254**2
_LB = 0.45359237
_BTU = 1055.05585262
_CAL = 4.184
_FT3 = 0.3048**3
_TORR = ATMOSPHERE / 760.0
SCF_MOLES: Final = 14.696 * _PSI * _FT3 / (R * 519.67 * 5 / 9)
"""mol in one standard cubic foot of an ideal gas."""


class Unit(NamedTuple):
    """One unit of one kind: the name shown, the kind, its SI factor and offset."""

    name: str
    kind: str
    factor: float
    offset: float = 0.0
    also: tuple[str, ...] = ()
    """Other spellings, compared with case kept."""


class Kind(NamedTuple):
    """A kind of quantity: what it is called, its SI unit, the unit of an empty field."""

    name: str
    words: str
    si: str
    default: str
    positive: bool = False
    """Whether only values above zero (in SI) make sense."""


KINDS: Final[dict[str, Kind]] = {
    k.name: k
    for k in (
        Kind("temperature", "temperature", "K", "degC", positive=True),
        Kind("temperature_difference", "temperature difference", "K", "K"),
        Kind("pressure", "pressure", "Pa", "bar", positive=True),
        Kind("pressure_difference", "pressure difference", "Pa", "bar"),
        Kind("amount", "amount of substance", "mol", "mol"),
        Kind("mass", "mass", "kg", "kg"),
        Kind("normal_volume", "gas amount by normal volume", "mol", "Nm3"),
        Kind("volume", "volume", "m3", "m3", positive=True),
        Kind("amount_flow", "molar flow", "mol/s", "kmol/h"),
        Kind("mass_flow", "mass flow", "kg/s", "kg/h"),
        Kind("normal_volume_flow", "gas flow by normal volume", "mol/s", "Nm3/h"),
        Kind("volume_flow", "volume flow", "m3/s", "m3/h"),
        Kind("amount_share", "share of the amount", "1", "mol %"),
        Kind("mass_share", "share of the mass", "1", "mass %"),
        Kind("energy", "energy", "J", "kJ"),
        Kind("power", "power", "W", "kW"),
        Kind("entropy", "entropy", "J/K", "kJ/K"),
        Kind("entropy_flow", "entropy flow", "W/K", "kW/K"),
        Kind("molar_energy", "energy per amount", "J/mol", "kJ/mol"),
        Kind("molar_entropy", "entropy per amount", "J/(mol K)", "J/(mol K)"),
        Kind("mass_energy", "energy per mass", "J/kg", "kJ/kg"),
        Kind("share", "share", "1", "%"),
    )
}

UNIONS: Final[dict[str, tuple[str, ...]]] = {
    # What one row of a stream may say, and what a stream's total may say.
    "feed": (
        "amount",
        "mass",
        "normal_volume",
        "volume",
        "amount_flow",
        "mass_flow",
        "normal_volume_flow",
        "volume_flow",
        "amount_share",
        "mass_share",
    ),
    "total": (
        "amount",
        "mass",
        "normal_volume",
        "volume",
        "amount_flow",
        "mass_flow",
        "normal_volume_flow",
        "volume_flow",
    ),
    # How much of a fed species is meant: a share of it, or an amount.
    "part": (
        "share",
        "amount",
        "mass",
        "normal_volume",
        "amount_flow",
        "mass_flow",
        "normal_volume_flow",
    ),
    # Extensive values of a batch or of a steady flow: the streams say which is meant.
    "heat": ("energy", "power"),
    "vessel": ("volume", "volume_flow"),
    "disorder": ("entropy", "entropy_flow"),
}


def _per_time(kind: str, of: tuple[Unit, ...]) -> tuple[Unit, ...]:
    """The same units per second, minute, hour and day."""
    times = {
        "s": (1.0, ("sec",)),
        "min": (60.0, ()),
        "h": (3600.0, ("hr", "hour")),
        "d": (86400.0, ("day",)),
    }
    return tuple(
        Unit(
            f"{u.name}/{t}",
            kind,
            u.factor / seconds,
            0.0,
            tuple(
                f"{spelled}/{time}"
                for spelled in (u.name, *u.also)
                for time in (t, *more)
                if (spelled, time) != (u.name, t)
            ),
        )
        for u in of
        for t, (seconds, more) in times.items()
    )


_AMOUNT = (
    Unit("mol", "amount", 1.0),
    Unit("kmol", "amount", 1e3),
    Unit("mmol", "amount", 1e-3),
    Unit("Mmol", "amount", 1e6),
    Unit("lbmol", "amount", _LB * 1e3, 0.0, ("lb-mol",)),
)
_MASS = (
    Unit("kg", "mass", 1.0),
    Unit("g", "mass", 1e-3),
    Unit("mg", "mass", 1e-6),
    Unit("t", "mass", 1e3, 0.0, ("tonne",)),
    Unit("lb", "mass", _LB, 0.0, ("lbs",)),
)
_NORMAL = (
    Unit("Nm3", "normal_volume", NORMAL_MOLES, 0.0, ("Nm³", "Nm^3", "m3(n)", "m³(n)")),
    Unit("NL", "normal_volume", NORMAL_MOLES * 1e-3, 0.0, ("Nl",)),
    Unit("Sm3", "normal_volume", STANDARD_MOLES, 0.0, ("Sm³", "Sm^3")),
    Unit("scf", "normal_volume", SCF_MOLES, 0.0, ("SCF",)),
)
_VOLUME = (
    Unit("m3", "volume", 1.0, 0.0, ("m³", "m^3")),
    Unit("L", "volume", 1e-3, 0.0, ("l", "litre", "liter", "dm3", "dm³")),
    Unit("mL", "volume", 1e-6, 0.0, ("ml", "cm3", "cm³")),
    Unit("ft3", "volume", _FT3, 0.0, ("ft³", "ft^3")),
)
_ENERGY = (
    Unit("J", "energy", 1.0),
    Unit("kJ", "energy", 1e3),
    Unit("MJ", "energy", 1e6),
    Unit("GJ", "energy", 1e9),
    Unit("Wh", "energy", 3600.0),
    Unit("kWh", "energy", 3.6e6),
    Unit("MWh", "energy", 3.6e9),
    Unit("cal", "energy", _CAL),
    Unit("kcal", "energy", _CAL * 1e3),
    Unit("Btu", "energy", _BTU, 0.0, ("BTU", "btu")),
    Unit("MMBtu", "energy", _BTU * 1e6, 0.0, ("MMBTU",)),
)
_ENTROPY = (
    Unit("J/K", "entropy", 1.0),
    Unit("kJ/K", "entropy", 1e3),
    Unit("MJ/K", "entropy", 1e6),
)

TABLE: Final[tuple[Unit, ...]] = (
    Unit("K", "temperature", 1.0, 0.0, ("kelvin", "Kelvin", "degK", "°K")),
    Unit("degC", "temperature", 1.0, 273.15, ("°C", "C", "℃", "deg C", "celsius", "Celsius")),
    Unit("degF", "temperature", 5 / 9, 459.67 * 5 / 9, ("°F", "F", "deg F", "fahrenheit")),
    Unit("degR", "temperature", 5 / 9, 0.0, ("°R", "rankine")),
    Unit("K", "temperature_difference", 1.0, 0.0, ("kelvin",)),
    Unit("degC", "temperature_difference", 1.0, 0.0, ("°C", "C", "℃", "deg C", "delta_degC")),
    Unit("degF", "temperature_difference", 5 / 9, 0.0, ("°F", "F", "deg F", "delta_degF")),
    *(
        unit
        for kind in ("pressure", "pressure_difference")
        for unit in (
            Unit("Pa", kind, 1.0),
            Unit("hPa", kind, 1e2),
            Unit("kPa", kind, 1e3, 0.0, ("kPaa", "kPa(a)")),
            Unit("MPa", kind, 1e6, 0.0, ("MPaa", "MPa(a)")),
            Unit("bar", kind, 1e5, 0.0, ("bara", "bar(a)")),
            Unit("mbar", kind, 1e2, 0.0, ("mbara", "mbar(a)")),
            Unit("atm", kind, ATMOSPHERE),
            Unit("torr", kind, _TORR, 0.0, ("Torr",)),
            Unit("mmHg", kind, 13595.1 * 9.80665 * 1e-3),
            Unit("psi", kind, _PSI, 0.0, ("psia", "psi(a)")),
        )
    ),
    Unit("barg", "pressure", 1e5, ATMOSPHERE, ("bar(g)", "bar g", "barü")),
    Unit("mbarg", "pressure", 1e2, ATMOSPHERE, ("mbar(g)", "mbar g")),
    Unit("kPag", "pressure", 1e3, ATMOSPHERE, ("kPa(g)", "kPa g")),
    Unit("MPag", "pressure", 1e6, ATMOSPHERE, ("MPa(g)", "MPa g")),
    Unit("psig", "pressure", _PSI, ATMOSPHERE, ("psi(g)", "psi g")),
    *_AMOUNT,
    *_MASS,
    *_NORMAL,
    *_VOLUME,
    *_per_time("amount_flow", _AMOUNT),
    *_per_time("mass_flow", _MASS),
    *_per_time("normal_volume_flow", _NORMAL),
    *_per_time("volume_flow", _VOLUME),
    Unit("mol %", "amount_share", 1e-2, 0.0, ("mol%", "mole %", "mole%", "mol-%")),
    Unit("mol ppm", "amount_share", 1e-6, 0.0, ("ppmv", "mol-ppm")),
    Unit("mass %", "mass_share", 1e-2, 0.0, ("mass%", "wt %", "wt%", "mass-%", "w%")),
    Unit("mass ppm", "mass_share", 1e-6, 0.0, ("ppmw", "mass-ppm", "wt ppm")),
    Unit("%", "share", 1e-2),
    Unit("1", "share", 1.0, 0.0, ("-",)),
    *_ENERGY,
    Unit("W", "power", 1.0),
    Unit("kW", "power", 1e3),
    Unit("MW", "power", 1e6),
    Unit("GW", "power", 1e9),
    *_per_time("power", tuple(u for u in _ENERGY if not u.name.endswith("Wh"))),
    *_ENTROPY,
    Unit("W/K", "entropy_flow", 1.0),
    Unit("kW/K", "entropy_flow", 1e3),
    Unit("MW/K", "entropy_flow", 1e6),
    *_per_time("entropy_flow", _ENTROPY),
    Unit("J/mol", "molar_energy", 1.0),
    Unit("kJ/mol", "molar_energy", 1e3, 0.0, ("J/mmol", "MJ/kmol")),
    Unit("kJ/kmol", "molar_energy", 1.0),
    Unit("kcal/mol", "molar_energy", _CAL * 1e3),
    Unit("J/(mol K)", "molar_entropy", 1.0, 0.0, ("J/mol/K", "J/(mol*K)", "J/(mol·K)")),
    Unit("J/kg", "mass_energy", 1.0),
    Unit("kJ/kg", "mass_energy", 1e3, 0.0, ("J/g",)),
    Unit("MJ/kg", "mass_energy", 1e6, 0.0, ("kJ/g",)),
)
