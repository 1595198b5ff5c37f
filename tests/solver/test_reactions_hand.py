"""The hand calculation of one reaction, beside the minimiser and term by term."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import pytest

import solver
from solver import InputError, NoEndState
from solver.reactions import HandCalculation, Reaction, hand_calculation
from species_db import P_STANDARD, R, Species
from tests.solver.mixtures import library


@dataclass(frozen=True)
class Sum:
    """A reaction, its feed (mol), and T (K) and p (Pa) to hold or to feed at."""

    text: str
    feed: str
    T: float
    p: float

    def __str__(self) -> str:
        return f"{self.text} from {self.feed} at {self.T:g} K"

    @property
    def reaction(self) -> Reaction:
        return Reaction.parse(self.text, library())

    @property
    def amounts(self) -> dict[Species, float]:
        words = self.feed.split()
        return {library()[k]: float(n) for k, n in zip(words[::2], words[1::2], strict=True)}

    @property
    def species(self) -> list[Species]:
        return list(dict.fromkeys([*self.reaction.species, *self.amounts]))

    def fixed(self, pair: str) -> solver.Fixed:
        fed = solver.as_fed(self.amounts, self.T, self.p)
        gas = any(sp.phase == "gas" for sp in self.amounts)
        V = fed.V if gas else 0.01  # a solid alone would fill its vessel
        held = {"T": self.T, "p": self.p, "H": fed.H, "U": fed.U, "V": V}
        first, second = pair.split(",")
        return solver.Fixed(pair, **{first: held[first], second: held[second]})


SUMS = [
    Sum("CO + H2O = CO2 + H2", "CO 1 H2O 2 N2 0.5", 700.0, 2e5),
    Sum("CO2 + H2 = CO + H2O", "CO 1 H2O 1e-3", 1200.0, 1e5),
    Sum("N2 + 3 H2 = 2 NH3", "N2 1 H2 3 Ar 0.1", 600.0, 1.5e7),
    Sum("2 SO2 + O2 = 2 SO3", "SO2 1 O2 1.1 N2 7.9", 690.0, 1.2e5),
    Sum("CH4 + 2 O2 = CO2 + 2 H2O", "CH4 1 O2 2", 298.15, 1e5),
    Sum("CH4 + 2 O2 = CO2 + 2 H2O", "CH4 1 O2 3 N2 7.52", 400.0, 3e5),
    Sum("H2 = 2 H", "H2 1", 3000.0, 1e5),
    Sum("CaCO3(s) = CaO(s) + CO2", "CaCO3(s) 1 N2 2", 1000.0, 1e5),
    Sum("CaCO3(s) = CaO(s) + CO2", "CaCO3(s) 1 N2 2", 1400.0, 1e5),
    Sum("CaCO3(s) = CaO(s) + CO2", "CaCO3(s) 2", 1500.0, 1e5),
    Sum("C(gr) + CO2 = 2 CO", "C(gr) 1 CO2 1", 950.0, 1e5),
    Sum("2 CO = C(gr) + CO2", "CO 2 Ar 0.3", 1100.0, 5e5),
    Sum("2 CO = C(gr) + CO2", "CO 1 CO2 1", 1400.0, 1e5),
    Sum("H2O(l) = H2O", "H2O(l) 1 N2 1", 330.0, 1e5),
    Sum("Fe0.947O(s) + H2 = 0.947 Fe(s) + H2O", "Fe0.947O(s) 1 H2 4", 1000.0, 1e5),
    Sum("2 Al(s) + Fe2O3(s) = Al2O3(s) + 2 Fe(s)", "Al(s) 2.2 Fe2O3(s) 1 N2 1", 600.0, 1e5),
    Sum("2 Al(s) + Fe2O3(s) = Al2O3(s) + 2 Fe(s)", "Al(s) 2 Fe2O3(s) 1.5", 800.0, 1e5),
    Sum("4 NH3 + 3 O2 = 2 N2 + 6 H2O", "NH3 0.4 O2 0.3", 400.0, 1e5),
    Sum("4 NH3 + 3 O2 = 2 N2 + 6 H2O", "NH3 0.12 O2 0.09 Ar 1", 400.0, 1e5),
    Sum("C2H4 + H2 = C2H6", "C2H4 1 H2 1.5 N2 0.2", 800.0, 2e6),
    Sum("H2O(l) = H2O", "H2O 1 N2 3", 330.0, 1e5),
]
every_sum = pytest.mark.parametrize("case", SUMS, ids=str)
every_pair = pytest.mark.parametrize("pair", ["T,p", "T,V", "H,p", "U,V"])


def done(case: Sum, pair: str, T0: float = 298.15) -> HandCalculation:
    return hand_calculation(case.reaction, case.amounts, case.fixed(pair), T0=T0)


@every_pair
@every_sum
def test_hand_calculation_is_what_the_minimiser_finds(case: Sum, pair: str):
    fixed = case.fixed(pair)
    hand = hand_calculation(case.reaction, case.amounts, fixed)
    end = solver.settle(case.species, case.amounts, fixed)
    assert hand.T == pytest.approx(end.T, rel=1e-9)
    assert hand.p == pytest.approx(end.p, rel=1e-9)
    assert hand.V == pytest.approx(end.V, rel=1e-9)
    for key, n in end.amounts.items():
        assert hand.amounts[key] == pytest.approx(n, rel=1e-9, abs=0.0), key  # traces too
    for key, activity in hand.absent.items():
        assert end.proof.absent[key] == pytest.approx(activity, rel=1e-8)


@every_sum
def test_table_adds_up(case: Sum):
    hand = done(case, "T,p")
    for row in hand.rows:
        assert row.end == pytest.approx(row.initial + row.change, abs=1e-12)
        assert row.change == pytest.approx(row.number * hand.extent)
        assert (row.number == 0.0) is (row.species not in case.reaction.species)
        assert (row.fraction is None) is (row.species.phase != "gas" or hand.gas_end == 0.0)
    fractions = [row.fraction for row in hand.rows if row.fraction is not None]
    assert not fractions or math.fsum(fractions) == pytest.approx(1.0)
    change = hand.gas_end - hand.gas_initial
    assert change == pytest.approx(hand.extent * case.reaction.gas_change, abs=1e-12)


@every_pair
@every_sum
def test_extent_is_bracketed(case: Sum, pair: str):
    """ln Q - ln K rises across the admissible extents and is zero only at the answer."""
    hand = done(case, pair)
    low, high = hand.limits
    assert low.extent <= hand.extent <= high.extent
    offs = [low.off, *(trial.off for trial in hand.trials), high.off]
    assert all(b >= a - 1e-9 for a, b in pairwise(offs))
    for trial in hand.trials:
        assert low.extent < trial.extent < high.extent
        if abs(trial.extent - hand.extent) > 1e-9 and abs(trial.off) > 1e-9:
            assert (trial.off > 0.0) is (trial.extent > hand.extent)
    inside = low.extent < hand.extent < high.extent
    if inside:
        assert hand.ln_q == pytest.approx(hand.ln_k, abs=1e-9)


@every_sum
def test_energy_closes_at_held_pressure(case: Sum):
    hand = done(case, "H,p", T0=case.T)
    account = hand.energy
    size = R * hand.T * math.fsum(row.end for row in hand.rows)
    assert abs(account.residual) < 1e-10 * size
    assert account.available == pytest.approx(
        account.reaction + account.heating + account.pressing, abs=1e-9 * size
    )
    assert account.reaction == pytest.approx(hand.extent * case.reaction.dh(case.T), rel=1e-12)
    assert account.variable == "H"


@every_sum
def test_energy_closes_in_a_sealed_vessel(case: Sum):
    """Reaction internal energy: reaction enthalpy - R T times the sum of the gas numbers."""
    hand = done(case, "U,V", T0=case.T)
    account = hand.energy
    size = R * hand.T * math.fsum(row.end for row in hand.rows)
    assert abs(account.residual) < 1e-10 * size
    by_label = {term.label: term for term in hand.terms}
    change = by_label["reaction internal energy at T0"]
    assert change.unit == "J/mol"
    dh = case.reaction.dh(case.T)
    work = R * case.T * case.reaction.gas_change
    assert by_label["R T0 times the gas numbers"].value == pytest.approx(work, abs=1e-9)
    condensed = by_label.get("1 bar times the condensed volumes")
    assert change.value == pytest.approx(dh - work - (condensed.value if condensed else 0.0))
    assert condensed is None or abs(condensed.value) < P_STANDARD * 1e-4
    assert account.reaction == pytest.approx(hand.extent * change.value, rel=1e-12)


@every_pair
def test_pressure_follows_from_the_gas_law(pair: str):
    case = SUMS[0]
    hand = done(case, pair)
    assert hand.p * hand.V == pytest.approx(hand.gas_end * R * hand.T, rel=1e-12)


@pytest.mark.parametrize("T0", [298.15, 500.0, 1500.0])
@pytest.mark.parametrize("pair", ["H,p", "U,V"])
def test_result_does_not_depend_on_where_the_balance_is_taken_apart(pair: str, T0: float):
    case = SUMS[3]
    one, other = done(case, pair), done(case, pair, T0)
    assert (one.T, one.extent) == (other.T, other.extent)
    assert abs(other.energy.residual) < 1e-7


def test_terms_can_be_followed_with_a_calculator():
    """Every term of an adiabatic burner, worked out again from the species alone."""
    lib = library()
    case = SUMS[5]
    hand = done(case, "H,p", T0=298.15)
    terms = {term.label: term.value for term in hand.terms}
    fed = case.amounts
    at_298 = math.fsum(n * sp.h(298.15) for sp, n in fed.items())
    warmth = math.fsum(n * (sp.h(400.0) - sp.h(298.15)) for sp, n in fed.items())
    assert terms["H of the feed at T0"] == pytest.approx(at_298)
    assert terms["energy to be placed"] == pytest.approx(warmth)
    burnt = lib["CO2"].h(298.15) + 2 * lib["H2O"].h(298.15) - lib["CH4"].h(298.15)
    assert terms["reaction enthalpy at T0"] == pytest.approx(burnt, rel=1e-6)
    assert terms["taken up by the reaction"] == pytest.approx(hand.extent * burnt, rel=1e-6)
    heating = 0.0
    for row in hand.rows:
        if row.end > 0.0:
            one = row.end * (row.species.h(hand.T) - row.species.h(298.15))
            assert terms[f"heating {row.species.key} from T0 to T"] == pytest.approx(one)
            heating += one
    assert hand.extent * burnt + heating == pytest.approx(warmth, rel=1e-6)
    assert all(term.how and term.unit for term in hand.terms)


def test_decomposition_under_its_own_gas_stays_at_one_temperature():
    """CaCO3 alone at 1 bar with too little energy to decompose wholly: T where K = p/p0."""
    case = SUMS[9]
    hand = done(case, "H,p")
    assert 0.0 < hand.extent < 2.0
    assert case.reaction.ln_k(hand.T) == pytest.approx(0.0, abs=0.01)
    assert any("temperature stays" in note for note in hand.notes)


def test_water_splits_into_liquid_and_vapour_at_its_boiling_point():
    lib = library()
    half = 0.5 * (lib["H2O"].h(373.17) + lib["H2O(l)"].h(373.17))
    hand = hand_calculation(
        Reaction.parse("H2O(l) = H2O", lib),
        {lib["H2O(l)"]: 1.0},
        solver.Fixed("H,p", H=half, p=1e5),
    )
    assert hand.T == pytest.approx(372.76, abs=0.6)  # IAPWS-95; the vapour here is ideal
    assert hand.extent == pytest.approx(0.5, abs=0.01)
    assert abs(hand.energy.residual) < 1e-6


def test_used_up_solid_has_an_activity_below_one():
    hand = done(SUMS[8], "T,p")
    (key,) = hand.absent
    assert key.startswith("CaCO3")
    assert 0.0 < hand.absent[key] < 1.0
    assert hand.limits[1].used_up == (key,)
    assert hand.extent == hand.limits[1].extent == 1.0


def test_small_rest_keeps_its_digits():
    """Exact stoichiometry at 298 K: 1e-46 of the fuel is left, in the proportion fed."""
    case = SUMS[4]
    hand = hand_calculation(case.reaction, case.amounts, solver.Fixed("T,p", T=298.15, p=1e5))
    left = hand.amounts
    assert 0.0 < left["CH4"] < 1e-30
    assert left["O2"] == pytest.approx(2.0 * left["CH4"], rel=1e-12)
    assert hand.ln_q == pytest.approx(hand.ln_k, abs=1e-10)


def test_vessel_nearly_full_of_liquid():
    """The gas has what the liquid leaves; the pressure presses on the liquid too."""
    lib = library()
    reaction = Reaction.parse("H2O(l) = H2O", lib)
    feed = {lib["H2O(l)"]: 1.0, lib["N2"]: 0.001}
    volume = lib["H2O(l)"].molar_volume
    if not volume:
        pytest.skip("the library has no volume of water")
    fixed = solver.Fixed("T,V", T=350.0, V=1.05 * volume)
    hand = hand_calculation(reaction, feed, fixed)
    room = hand.V - hand.amounts["H2O(l)"] * volume
    assert hand.p == pytest.approx(hand.gas_end * R * 350.0 / room, rel=1e-9)
    vapour = hand.p * hand.amounts["H2O"] / hand.gas_end
    pressed = volume * (hand.p - P_STANDARD) / (R * 350.0)
    assert math.log(vapour / P_STANDARD) == pytest.approx(reaction.ln_k(350.0) + pressed, abs=1e-9)
    end = solver.settle([lib["H2O(l)"], lib["H2O"], lib["N2"]], feed, fixed)
    assert hand.p == pytest.approx(end.p, rel=1e-9)


def test_other_reactions_of_the_same_species_are_mentioned():
    lib = library()
    reaction = Reaction.parse("CO + H2O = CO2 + H2", lib)
    feed = {lib[k]: 1.0 for k in ("CO", "H2O", "CH4")}
    hand = hand_calculation(reaction, feed, solver.Fixed("T,p", T=700.0, p=1e5))
    assert any("other reactions" in note for note in hand.notes)
    assert hand.amounts["CH4"] == 1.0
    assert not done(SUMS[0], "T,p").notes


def test_bad_input_is_refused():
    lib = library()
    case = SUMS[0]
    reaction, feed, Tp = case.reaction, case.amounts, case.fixed("T,p")
    with pytest.raises(InputError) as caught:
        hand_calculation(reaction, feed, solver.Fixed("S,p", S=1.0, p=1e5))
    assert caught.value.field == "fixed.pair"
    with pytest.raises(InputError) as caught:
        hand_calculation(reaction, feed, Tp, T0=-1.0)
    assert caught.value.field == "T0"
    with pytest.raises(InputError) as caught:
        hand_calculation(reaction, {lib["CO"]: 1.0, lib["CO2"]: 1.0}, Tp)
    assert caught.value.field == "feed"
    assert "H2O" in str(caught.value)
    with pytest.raises(InputError) as caught:
        hand_calculation(reaction, {lib["CO"]: -1.0, lib["H2O"]: 1.0}, Tp)
    assert caught.value.field == "feed[CO]"
    with pytest.raises(InputError) as caught:
        hand_calculation(reaction, feed, Tp, gas="srk")
    assert caught.value.field == "gas"


def test_vessel_too_small_for_its_solids_is_refused():
    lib = library()
    solid = lib["CaCO3(s)"]
    if not solid.molar_volume or not lib["CaO(s)"].molar_volume:
        pytest.skip("the library has no volumes of these")
    reaction = Reaction.parse("CaCO3(s) = CaO(s) + CO2", lib)
    with pytest.raises(InputError) as caught:
        hand_calculation(reaction, {solid: 1.0}, solver.Fixed("T,V", T=1000.0, V=1e-7))
    assert caught.value.field == "fixed.V"
    assert caught.value.value == 1e-7


@pytest.mark.parametrize(("H", "word"), [(-1e9, "raise"), (1e12, "lower")])
def test_energy_out_of_reach_has_no_end_state(H: float, word: str):
    case = SUMS[0]
    with pytest.raises(NoEndState) as caught:
        hand_calculation(case.reaction, case.amounts, solver.Fixed("H,p", H=H, p=1e5))
    assert caught.value.field == "fixed.H"
    assert word in str(caught.value)
