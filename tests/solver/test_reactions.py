"""Reactions as text and as exact arithmetic: reading, writing, balance, independence."""

from __future__ import annotations

import pickle
from fractions import Fraction

import numpy as np
import pytest

from solver import InputError
from solver.reactions import Reaction, check_independent, parse_set, reaction_count
from solver.reactions.balance import balanced, composition, null_vectors, surplus, tidy
from species_db import R
from tests.solver.mixtures import library


def parsed(text: str) -> Reaction:
    return Reaction.parse(text, library())


def numbers(text: str) -> dict[str, Fraction]:
    return {sp.key: nu for sp, nu in parsed(text).terms}


SHIFT = {"CO": -1, "H2O": -1, "CO2": 1, "H2": 1}


@pytest.mark.parametrize(
    "text",
    [
        "CO + H2O = CO2 + H2",
        "CO+H2O=CO2+H2",
        "CO + H2O -> CO2 + H2",
        "CO + H2O → CO2 + H2",
        "CO + H2O ⇌ CO2 + H2",
        "CO + H2O <=> CO2 + H2",
        "CO₂ + H₂ = CO + H₂O",
        "1 CO + 1.0 H2O = 2/2 CO2 + H2",
        "carbon monoxide + H2O = carbon dioxide + hydrogen",
        "2 CO + H2O = CO2 + CO + H2",
    ],
)
def test_one_reaction_may_be_written_in_many_ways(text: str):
    found = numbers(text)
    assert found == SHIFT or found == {key: -nu for key, nu in SHIFT.items()}


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("H2 + ½ O2 = H2O", {"H2": -1, "O2": Fraction(-1, 2), "H2O": 1}),
        ("H2+0.5O2=H2O", {"H2": -1, "O2": Fraction(-1, 2), "H2O": 1}),
        ("H2 + 0,5 O2 = H2O", {"H2": -1, "O2": Fraction(-1, 2), "H2O": 1}),
        ("2 H2O(l) = 2 H2 + O2", {"H2O(l)": -2, "H2": 2, "O2": 1}),
        ("2*H2 + O2 = 2 H2O", {"H2": -2, "O2": -1, "H2O": 2}),
        (
            "Fe0.947O(s) + CO = 0.947 Fe(s) + CO2",
            {"Fe0.947O(s)": -1, "CO": -1, "Fe(s)": Fraction("0.947"), "CO2": 1},
        ),
        ("H3O+ + e- = H2O + H", {"H3O+": -1, "e-": -1, "H2O": 1, "H": 1}),
        ("H2O + H+ = H3O+", {"H2O": -1, "H+": -1, "H3O+": 1}),
        ("C2H2 = 2 C(gr) + H2", {"C2H2": -1, "C(gr)": 2, "H2": 1}),
    ],
)
def test_numbers_are_kept_as_written(text: str, expected: dict[str, Fraction]):
    assert numbers(text) == expected


@pytest.mark.parametrize(
    ("text", "plain", "pretty"),
    [
        ("CH4+H2O=CO+3H2", "CH4 + H2O = CO + 3 H2", "CH₄ + H₂O = CO + 3 H₂"),
        ("N2 + 3 H2 = 2 NH3", "N2 + 3 H2 = 2 NH3", "N₂ + 3 H₂ = 2 NH₃"),
        ("H2 + .5 O2 = H2O(l)", "H2 + 1/2 O2 = H2O(l)", "H₂ + 1/2 O₂ = H₂O(l)"),
        ("H2O + H+ = H3O+", "H2O + H+ = H3O+", "H₂O + H⁺ = H₃O⁺"),
        (
            "Fe0.947O(s)+CO=.947 Fe(s)+CO2",
            "Fe0.947O(s) + CO = 0.947 Fe(s) + CO2",
            "Fe₀.₉₄₇O(s) + CO = 0.947 Fe(s) + CO₂",
        ),
    ],
)
def test_text_is_plain_or_with_lowered_counts(text: str, plain: str, pretty: str):
    reaction = parsed(text)
    assert reaction.text == str(reaction) == plain
    assert reaction.pretty == pretty
    assert parsed(reaction.text) == reaction
    assert parsed(reaction.pretty) == reaction


def test_reaction_can_be_turned_scaled_hashed_and_sent():
    reaction = parsed("CO + 1/2 O2 = CO2")
    assert reaction.reversed.reversed == reaction
    assert {sp.key: nu for sp, nu in reaction.whole.terms} == {"CO": -2, "O2": -1, "CO2": 2}
    assert reaction.gas_change == -0.5
    assert pickle.loads(pickle.dumps(reaction)) == reaction
    assert len({reaction, parsed("CO + 0.5 O2 = CO2")}) == 1
    assert Reaction.of({sp: float(nu) for sp, nu in reaction.terms}) == reaction


@pytest.mark.parametrize(
    ("text", "field", "words", "allowed"),
    [
        ("CO + H2O = CO2 + 2 H2", "reaction", "2 H too many on the right", "CO + H2O = CO2 + H2"),
        ("CH4 + O2 = CO2 + H2O", "reaction", "1 O too many on the right", "CH4 + 2 O2 = CO2"),
        ("CO + H2O = CO2", "reaction", "2 H too many on the left", "atoms"),
        ("H2O = H+ + OH", "reaction", "1 units of charge too many on the right", "charge"),
        ("Fe0.947O(s) + CO = Fe(s) + CO2", "reaction", "0.053 Fe too many on the right", "0.947"),
        ("CO + H2O", "reaction", "no sign between", "such as"),
        ("CO = CO2 = C(gr)", "reaction", "more than two sides", "such as"),
        ("CO + + H2O = CO2 + H2", "reaction", "empty place", "such as"),
        (" = CO2", "reaction", "empty place", "such as"),
        ("", "reaction", "no sign between", "such as"),
        ("CO = CO", "reaction", "everything cancels", "such as"),
        ("CO + H2O = CO2 + Hx2", "reaction", "'Hx2'", ""),
        ("0 CO + H2O = CO2 + H2", "reaction", "number before a species", "above zero"),
        ("1/0 CO = CO2", "reaction", "number before a species", "above zero"),
        ("-1 CO = CO2", "reaction", "number before a species", "above zero"),
        ("2 3H2 = 6 H2", "reaction", "number before a species", "above zero"),
    ],
)
def test_what_is_no_reaction_is_refused(text: str, field: str, words: str, allowed: str):
    with pytest.raises(InputError) as caught:
        parsed(text)
    assert caught.value.field == field
    assert words in str(caught.value)
    assert caught.value.allowed
    assert allowed in caught.value.allowed
    assert caught.value.value in (text, text.strip()) or str(caught.value.value) in text


def test_species_of_a_case_may_be_named_by_key_bare_formula_or_name():
    lib = library()
    species = [lib[key] for key in ("C(gr)", "CO", "CO2", "H2O(l)", "H2O", "H2")]
    assert Reaction.parse("C + CO2 = 2 CO", species) == Reaction.parse("C(gr) + CO2 = 2 CO", lib)
    reaction = Reaction.parse("Carbon Monoxide + H2O = CO2 + H2", species)
    assert reaction == parsed("CO + H2O = CO2 + H2")
    with pytest.raises(InputError) as caught:
        Reaction.parse("CH4 + H2O = CO + 3 H2", species, field="approach.reaction")
    assert caught.value.field == "approach.reaction"
    assert caught.value.value == "CH4"
    assert "CO2" in caught.value.allowed


def test_dependent_reaction_is_named_with_how_it_follows():
    texts = ["CO + H2O = CO2 + H2", "", "CH4 + H2O = CO + 3 H2", "2 CH4 + 4 H2O = 2 CO2 + 8 H2"]
    with pytest.raises(InputError) as caught:
        parse_set(texts, library(), field="case.reactions")
    error = caught.value
    assert error.field == "case.reactions[3]"
    assert error.value == "2 CH4 + 4 H2O = 2 CO2 + 8 H2"
    assert "2 times reaction 1 + 2 times reaction 3" in str(error)
    kept = parse_set(texts[:3], library())
    assert [r.text for r in kept] == [texts[0], texts[2]]


def test_reaction_and_its_reverse_are_one():
    shift = parsed("CO + H2O = CO2 + H2")
    with pytest.raises(InputError, match="it is minus reaction 1"):
        check_independent([shift, shift.reversed])


def test_faulty_reaction_of_a_set_is_named_by_its_place():
    with pytest.raises(InputError) as caught:
        parse_set(["CO + H2O = CO2 + H2", "CH4 + H2O = CO + H2"], library())
    assert caught.value.field == "reactions[1]"


def test_stoichiometric_numbers_must_be_finite_and_on_both_sides():
    lib = library()
    with pytest.raises(InputError, match="finite"):
        Reaction.of({lib["CO"]: -1.0, lib["CO2"]: float("nan")})
    with pytest.raises(InputError, match="either side"):
        Reaction.of({lib["CO"]: -1.0})


@pytest.mark.parametrize(
    ("keys", "expected"),
    [
        ("CH4 O2 CO2 H2O", "CH4 + 2 O2 = CO2 + 2 H2O"),
        ("Fe3O4(s) CO Fe0.947O(s) CO2", "0.947 Fe3O4(s) + 0.788 CO = 3 Fe0.947O(s) + 0.788 CO2"),
        ("C2H2 C60 H2", "30 C2H2 = C60 + 30 H2"),
        ("C6H14 O2 CO2 H2O", "2 C6H14 + 19 O2 = 12 CO2 + 14 H2O"),
    ],
)
def test_balanced_finds_the_numbers(keys: str, expected: str):
    found = balanced([library()[key] for key in keys.split()])
    assert found is not None
    assert not surplus(found)
    assert Reaction(tuple(found.items())).text == expected


def test_balanced_is_none_where_there_is_no_one_reaction():
    lib = library()
    assert balanced([lib["CO"], lib["H2"]]) is None
    assert balanced([lib[key] for key in "CH4 H2O CO CO2 H2".split()]) is None
    assert balanced([lib["CO"], lib["CO2"], lib["O2"], lib["N2"]]) is None  # N2 would be zero


def test_null_vectors_agree_with_numerical_rank():
    rng = np.random.default_rng(5)
    for _ in range(50):
        A = rng.integers(-2, 4, (4, 7)) * (rng.random((4, 7)) < 0.6)
        columns = [{str(k): Fraction(int(a)) for k, a in enumerate(col) if a} for col in A.T]
        vectors = null_vectors(columns)
        assert len(vectors) == 7 - np.linalg.matrix_rank(A)
        for vector in vectors:
            assert not any(A.astype(object) @ np.array(vector, dtype=object))


def test_tidy_does_not_change_the_reaction():
    lib = library()
    given = {lib["CO"]: Fraction(-3, 7), lib["O2"]: Fraction(-3, 14), lib["CO2"]: Fraction(3, 7)}
    assert {sp.key: nu for sp, nu in tidy(given).items()} == {"CO": -2, "O2": -1, "CO2": 2}


def test_reaction_count_is_species_less_rank():
    lib = library()
    assert reaction_count([lib[key] for key in "CH4 H2O CO CO2 H2".split()]) == 2
    assert reaction_count([lib[key] for key in "CO2 H2O".split()]) == 0
    assert reaction_count([lib[key] for key in "H+ OH H2O e- H O".split()]) == 3
    assert composition(lib["e-"]) == {"charge": -1}


@pytest.mark.parametrize(
    "text",
    [
        "CO + H2O = CO2 + H2",
        "CH4 + H2O = CO + 3 H2",
        "C(gr) + CO2 = 2 CO",
        "CaCO3(s) = CaO(s) + CO2",
        "N2 + O2 = 2 NO",
        "H2O(l) = H2O",
        "Fe0.947O(s) + H2 = 0.947 Fe(s) + H2O",
    ],
)
def test_slope_of_ln_K_is_the_enthalpy_over_RT2(text: str):
    """van 't Hoff, by central differences: error of order (step/T)^2 of the curvature."""
    reaction = parsed(text)
    low, high = reaction.data_range
    for T in np.linspace(max(low, 300.0), min(high, 2500.0), 7)[1:-1]:
        step = 1e-3 * T
        slope = (reaction.ln_k(T + step) - reaction.ln_k(T - step)) / (2.0 * step)
        assert slope == pytest.approx(reaction.dh(T) / (R * T**2), rel=2e-5, abs=1e-9)
        assert reaction.dg(T) == pytest.approx(reaction.dh(T) - T * reaction.ds(T), rel=1e-9)
        by_T = (reaction.dh(T + step) - reaction.dh(T - step)) / (2.0 * step)
        assert by_T == pytest.approx(reaction.dcp(T), rel=1e-3, abs=0.05)


def test_standard_properties_take_arrays():
    reaction = parsed("CO + H2O = CO2 + H2")
    T = np.array([400.0, 800.0, 1600.0])
    np.testing.assert_allclose(reaction.ln_k(T), [reaction.ln_k(float(t)) for t in T], rtol=1e-12)


JANAF = """
H2 = 2 H              | 2000 -12.839 | 2600 -6.516 | 3000 -3.689 | 4000 0.935   | 0.01
O2 = 2 O              | 2000 -14.621 | 3000 -4.356 | 4000 0.797                 | 0.01
N2 = 2 N              | 2000 -41.654 | 3000 -22.367                             | 0.01
H2O = H2 + 1/2 O2     | 1000 -23.164 | 2000 -8.151 | 2200 -6.774 | 3000 -3.095  | 0.03
H2O = 1/2 H2 + OH     | 2000 -8.704  | 3000 -2.924                              | 0.03
CO2 = CO + 1/2 O2     | 1000 -23.528 | 2000 -6.634 | 2600 -2.795 | 3000 -1.110  | 0.01
1/2 N2 + 1/2 O2 = NO  | 1000 -9.355  | 2000 -3.912 | 2600 -2.657 | 3000 -2.102  | 0.01
"""
"""ln K at 1 bar, and the tolerance last.

From the tables of M. W. Chase, NIST-JANAF Thermochemical Tables, 4th ed., 1998.
"""
REVISED = {"N": 472_683.0, "OH": 38_987.0, "NO": 90_291.0}
"""Enthalpies of formation at 298.15 K in those tables, J/mol.

They have been revised since (by 0.2, 1.5 and 0.8 kJ/mol), which alone moves ln K by up to 0.1.
"""


@pytest.mark.parametrize("line", JANAF.strip().splitlines())
def test_K_of_dissociation_agrees_with_the_tables(line: str):
    text, *points, tolerance = (part.strip() for part in line.split("|"))
    reaction = parsed(text)
    then = sum(
        float(nu) * (REVISED[sp.key] - sp.h(298.15))
        for sp, nu in reaction.terms
        if sp.key in REVISED
    )
    assert abs(then) < 2000.0
    for T, ln_k in (map(float, point.split()) for point in points):
        found = reaction.ln_k(T) - then / (R * T)
        assert found == pytest.approx(ln_k, abs=float(tolerance)), f"{text} at {T} K"


@pytest.mark.parametrize("celsius", [500.0, 600.0, 700.0, 800.0, 900.0, 1000.0])
def test_K_of_reforming_agrees_with_the_handbook(celsius: float):
    """Polynomial of M. V. Twigg (ed.), Catalyst Handbook, 2nd ed., 1989, appendix; in atm2."""
    Z = 1000.0 / (celsius + 273.15) - 1.0
    back = np.polyval([0.2513, -0.3665, -0.58101, 27.1337, -3.2770], Z)
    reaction = parsed("CH4 + H2O = CO + 3 H2")
    in_atm = reaction.k(celsius + 273.15) / 1.01325**2
    assert in_atm == pytest.approx(np.exp(-back), rel=0.03)


@pytest.mark.parametrize("celsius", [300.0, 400.0, 500.0, 600.0, 700.0, 800.0, 900.0, 1000.0])
def test_K_of_shift_agrees_with_the_handbook(celsius: float):
    """Polynomial of M. V. Twigg (ed.), Catalyst Handbook, 2nd ed., 1989, appendix."""
    Z = 1000.0 / (celsius + 273.15) - 1.0
    expected = np.exp(np.polyval([-0.29353, 0.63508, 4.1778, 0.31688], Z))
    assert parsed("CO + H2O = CO2 + H2").k(celsius + 273.15) == pytest.approx(expected, rel=0.06)
