"""Reading and writing quantities at the edges."""

import math
import subprocess
import sys

import pint
import pytest

from solver.errors import InputError
from solver.project import units, wording
from solver.project.model import Quantity
from solver.project.unit_table import KINDS, NORMAL_MOLES, STANDARD_MOLES, TABLE, UNIONS

_PINT_NAME = {
    "lbmol": "lb * kmol / kg",
    "ft3": "ft**3",
    "m3": "m**3",
    "Nm3": f"{101325 / (8.31446261815324 * 273.15)!r} mol",
    "Sm3": f"{101325 / (8.31446261815324 * 288.15)!r} mol",
    "NL": f"{101.325 / (8.31446261815324 * 273.15)!r} mol",
    "scf": f"{14.696 * 6894.757293168361 * 0.3048**3 / (8.31446261815324 * 519.67 / 1.8)!r} mol",
    "MMBtu": "Btu * 1e6",
    "t": "tonne",
    "Wh": "watt_hour",
    "kWh": "kilowatt_hour",
    "MWh": "megawatt_hour",
    "d": "day",
    "psi": "psi",
    "mmHg": "mmHg",
    "J/(mol K)": "J/(mol*K)",
    "mol %": "0.01",
    "mass %": "0.01",
    "%": "0.01",
    "mol ppm": "1e-6",
    "mass ppm": "1e-6",
    "1": "1",
}


@pytest.mark.parametrize(
    "unit",
    [u for u in TABLE if u.offset == 0 and u.kind != "temperature_difference"],
    ids=lambda u: f"{u.kind}-{u.name}",
)
def test_every_factor_of_the_table_is_the_one_pint_has(unit):
    registry = _registry()
    text = (
        _PINT_NAME[unit.name]
        if unit.name in _PINT_NAME
        else "/".join(f"({_PINT_NAME.get(part, part)})" for part in unit.name.split("/"))
    )
    quantity = registry.parse_expression(text)
    if hasattr(quantity, "to"):
        si = KINDS[unit.kind].si.replace("m3", "m**3")
        quantity = quantity.to(si if si != "1" else "")
        quantity = quantity.magnitude
    # pint carries the Btu to seven figures; all else is exact
    tolerance = 1e-6 if "Btu" in unit.name else 1e-12
    assert unit.factor == pytest.approx(quantity, rel=tolerance)


_kept: list[pint.UnitRegistry] = []


def _registry() -> pint.UnitRegistry:
    if not _kept:
        _kept.append(pint.UnitRegistry())
    return _kept[0]


@pytest.mark.parametrize("name", ["degC", "degF"])
def test_temperatures_with_a_zero_of_their_own_agree_with_pint(name):
    ours = units.to_si(Quantity(value=37.5, unit=name), "temperature")
    assert ours == pytest.approx(_registry().Quantity(37.5, name).to("K").magnitude, rel=1e-13)


@pytest.mark.parametrize(
    ("text", "kind", "si"),
    [
        ("25 degC", "temperature", 298.15),
        ("25 C", "temperature", 298.15),
        ("25 °C", "temperature", 298.15),
        ("25°C", "temperature", 298.15),
        ("25", "temperature", 298.15),
        ("−40 °F", "temperature", pytest.approx(233.15)),
        ("1100 K", "temperature", 1100.0),
        ("10 degC", "temperature_difference", 10.0),
        ("18 °F", "temperature_difference", 10.0),
        ("5 barg", "pressure", 601325.0),
        ("5 bar(g)", "pressure", 601325.0),
        ("-0.5 barg", "pressure", 51325.0),
        ("24 bar", "pressure", 24e5),
        ("1.2e5 Pa", "pressure", 1.2e5),
        ("1.2 × 10⁵ Pa", "pressure", 1.2e5),
        ("1,2*10^5 Pa", "pressure", 1.2e5),
        ("1 atm", "pressure", 101325.0),
        ("0 psig", "pressure", 101325.0),
        ("14.695948775 psi", "pressure", pytest.approx(101325.0, rel=1e-9)),
        ("1200 kg/h", "feed", pytest.approx(1 / 3)),
        ("1 200 kg/h", "feed", pytest.approx(1 / 3)),
        ("1,200,000 g/h", "feed", pytest.approx(1 / 3)),
        ("1.200.000 g/h", "feed", pytest.approx(1 / 3)),
        ("1.200,5 kg", "feed", 1200.5),
        ("1,200.5 kg", "feed", 1200.5),
        ("0,500 kmol", "feed", 500.0),
        ("1,5 kmol", "feed", 1500.0),
        ("0.5 kmol/h", "feed", pytest.approx(500 / 3600)),
        ("100 Nm3/h", "feed", pytest.approx(100 * 44.615033 / 3600, rel=1e-7)),
        ("100 Nm³/h", "feed", pytest.approx(100 * 44.615033 / 3600, rel=1e-7)),
        ("21 mol %", "feed", 0.21),
        ("21 mol%", "feed", 0.21),
        ("3 wt%", "feed", 0.03),
        ("3 MW", "heat", 3e6),
        ("-50 kW", "heat", -5e4),
        ("100 kJ", "heat", 1e5),
        ("20 L", "vessel", 0.02),
        ("2 m3", "vessel", 2.0),
        ("3600 m³/h", "vessel", 1.0),
        (".5 m3", "volume", 0.5),
    ],
)
def test_texts_an_engineer_types(text, kind, si):
    assert units.to_si(units.parse_quantity(text, kind), kind) == si


def test_molar_volume_of_the_normal_cubic_metre():
    """22.413 969 54 L/mol at 273.15 K and 101325 Pa: CODATA 2018 (constants exact)."""
    litres = 1e3 / NORMAL_MOLES
    assert litres == pytest.approx(22.41396954, rel=1e-9)
    assert NORMAL_MOLES / STANDARD_MOLES == pytest.approx(288.15 / 273.15, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "kind", "named"),
    [
        ("1,200 kg/h", "feed", "1200 or 1.200"),
        ("abc", "temperature", "'abc'"),
        ("", "temperature", "Nothing is written"),
        ("nan K", "temperature", "not a number"),
        ("1e999 K", "temperature", "too large"),
        ("25 kelvn", "temperature", "K"),
        ("5 baar", "pressure", "bar"),
        ("5 kg", "pressure", "unit of mass"),
        ("5 barg", "pressure_difference", "unit of pressure;"),
        ("5 %", "feed", "mol % or mass %"),
        ("5 furlongs", "feed", "another kind"),
        ("5 Nm3", "volume", "normal volume"),
        ("0 K", "temperature", "absolute zero"),
        ("-300 degC", "temperature", "-273.15"),
        ("0 bar", "pressure", "vacuum"),
        ("-2 barg", "pressure", "-1.01325"),
        ("0 m3", "volume", "above zero"),
        ("1 2 3 kg", "feed", "not a number with a unit"),
        ("1..2 kg", "feed", "not a number"),
        ("5 __import__('os')", "energy", "not known"),
        ("5 m**9**9**9", "energy", "not known"),
        ("5 J^999999999", "energy", "not known"),
    ],
)
def test_what_cannot_be_read_is_named_with_a_way_out(text, kind, named):
    with pytest.raises(units.UnitError) as caught:
        units.parse_quantity(text, kind, field="streams[0].T")
    error = caught.value
    assert isinstance(error, InputError)
    assert named.replace("-", "\u2212") in str(error) or named in str(error)
    assert error.field == "streams[0].T"
    assert error.allowed
    assert "\n" not in str(error)


def test_rare_units_come_from_pint():
    assert units.to_si(units.parse_quantity("30 inHg", "pressure"), "pressure") == pytest.approx(
        101591.7, rel=1e-5
    )
    assert units.to_si(units.parse_quantity("2 oz/min", "feed"), "feed") == pytest.approx(
        2 * 0.028349523125 / 60
    )
    assert units.unit_kind("oz/min", "feed") == "mass_flow"
    force = units.parse_quantity("10 kgf/cm2", "pressure")
    assert units.to_si(force, "pressure") == pytest.approx(980665.0)


def test_values_go_out_in_the_unit_they_came_in():
    for kind in KINDS:
        for unit in units.units_of(kind):
            si = 310.0 if kind == "temperature" else 2.5e5
            there = units.from_si(si, unit, kind)
            back = units.to_si(Quantity(value=there, unit=unit), kind)
            assert back == pytest.approx(si, rel=1e-12), (kind, unit)


def test_every_union_is_of_kinds_and_no_spelling_means_two_things():
    for kind in (*KINDS, *UNIONS):
        seen: dict[str, str] = {}
        for unit in TABLE:
            if unit.kind in UNIONS.get(kind, (kind,)):
                for spelling in (unit.name, *unit.also):
                    text = units._squeeze(spelling)
                    assert seen.setdefault(text, unit.name) == unit.name, (kind, spelling)


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (1.0, "1.000"),
        (1103.24, "1103"),
        (298.16, "298.2"),
        (9999.9, "10000"),
        (123456.0, "123456"),
        (1234567.0, "1.235 × 10⁶"),
        (0.00123456, "0.001235"),
        (0.00012346, "1.235 × 10⁻⁴"),
        (-1.23e-5, "−1.230 × 10⁻⁵"),
        (0.99999, "1.000"),
        (math.inf, "∞"),
        (math.nan, "–"),
    ],
)
def test_numbers_as_shown(value, text):
    assert units.number_text(value) == text


def test_shown_numbers_can_be_typed_back():
    for value in (1.2345e-9, -3.21e12, 0.5, 1234.0, 7.7e-4):
        shown = units.number_text(value, 12)
        assert units.parse_number(shown) == pytest.approx(value, rel=1e-11)


@pytest.mark.parametrize(
    ("key", "shown"),
    [
        ("H2O", "H₂O"),
        ("H2O(l)", "H₂O(l)"),
        ("Fe0.947O(s)", "Fe₀.₉₄₇O(s)"),
        ("Ca(OH)2(s)", "Ca(OH)₂(s)"),
        ("C4H10(isobutane)", "C₄H₁₀(isobutane)"),
        ("C3H8O(2-propanol)", "C₃H₈O(2-propanol)"),
        ("C(gr)", "C(gr)"),
        ("SiO2(quartz)", "SiO₂(quartz)"),
    ],
)
def test_formulas_get_subscripts(key, shown):
    assert units.formula_text(key) == shown


def test_units_as_shown():
    assert units.quantity_text(25.0, "degC") == "25.00 °C"
    assert units.unit_text("Nm3/h") == "Nm³/h"
    assert units.typed_number(25.0) == "25"
    assert units.typed_number(1.2e-7) == "1.2e-7"
    for typed in ("0.12345678901234", "1234.5678", "1e30", "-5"):
        assert units.typed_number(units.parse_number(typed)) == typed


def test_pint_stays_unloaded_for_the_common_units():
    code = (
        "import sys; from solver.project import units;"
        "units.parse_quantity('100 Nm3/h', 'feed'); units.parse_quantity('5 barg', 'pressure');"
        "print('pint' in sys.modules, 'scipy' in sys.modules, 'pandas' in sys.modules)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.split()[0] == "False"


@pytest.mark.parametrize(
    ("plain", "shown"),
    [
        ("so little enthalpy (-1.86463e+08);", "so little enthalpy (−1.86463 × 10⁸);"),
        ("The vessel of 1e-05 m3 is", "The vessel of 1 × 10⁻⁵ m³ is"),
        ("held at K(T - 8 K)", "held at K(T − 8 K)"),
        ("C4H10(1-butene) and 2e5x", "C4H10(1-butene) and 2e5x"),
        ("0.5 m3", "0.5 m³"),
    ],
)
def test_sentences_of_the_solver_are_typeset(plain, shown):
    assert wording.typeset(plain) == shown
