"""Reactions at end states and at measured compositions: extents, K and Q, approach."""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np
import pytest

import solver
from solver import InputError
from solver.reactions import (
    Reaction,
    ReactionsView,
    equilibrium_temperature,
    extents_of,
    parse_set,
    reaction_count,
    reaction_figures,
    reactions_at,
)
from solver.reactions.independence import check_independent
from solver.reactions.root import bracketed_root
from species_db import R, Species
from tests.solver.mixtures import BY_NAME, MIXTURES, Mixture, library
from tests.solver.peers.problems import random_problem

every_mixture = pytest.mark.parametrize("mixture", MIXTURES, ids=str)


def settled(mixture: Mixture) -> solver.EndState:
    fixed = solver.Fixed("T,p", T=mixture.T, p=mixture.p)
    return solver.settle(mixture.species, mixture.feed_amounts, fixed)


def parsed(text: str) -> Reaction:
    return Reaction.parse(text, library())


def feed_of(**amounts: float) -> dict[Species, float]:
    return {library()[key]: n for key, n in amounts.items()}


def check_set(view: ReactionsView) -> None:
    """As many as there are, independent, balanced, every one in tidy numbers."""
    check_independent(view.reactions)
    assert len(view.figures) == reaction_count(view.species)
    assert view.complete
    for figures in view.figures:
        reaction = figures.reaction
        assert set(reaction.species) <= set(view.species)
        for element in {e for sp in reaction.species for e in sp.elements}:
            off = math.fsum(float(nu) * sp.elements.get(element, 0.0) for sp, nu in reaction.terms)
            assert abs(off) < 1e-12 * max(abs(float(nu)) for _, nu in reaction.terms)
        if all(n == int(n) for sp in reaction.species for n in sp.elements.values()):
            whole = [int(nu) for _, nu in reaction.terms]
            assert all(nu == n for (_, nu), n in zip(reaction.terms, whole, strict=True))
            assert math.gcd(*whole) == 1


def check_amounts(
    view: ReactionsView, end: solver.EndState, feed: Mapping[Species, float], share: float
) -> None:
    """Feed plus reactions gives the end amounts, but for what the traces left out hold."""
    made = {sp.key: 0.0 for sp in (*end.species, *feed)}
    for sp, n in feed.items():
        made[sp.key] += n
    for figures in view.figures:
        assert figures.extent is not None
        for sp, nu in figures.reaction.terms:
            made[sp.key] += float(nu) * figures.extent
    total = sum(end.amounts.values())
    traces = sum(view.left_out.values())
    assert max(view.left_out.values(), default=0.0) <= share * total
    for key, n in made.items():
        assert n == pytest.approx(end.amounts.get(key, 0.0), abs=1e-12 * total + 30.0 * traces)
    assert view.extents.residual <= 1e-12 + 30.0 * traces / total


@every_mixture
def test_chosen_set_is_independent_and_tidy(mixture: Mixture):
    check_set(reactions_at(settled(mixture), mixture.feed_amounts))


@every_mixture
def test_extents_give_the_amounts(mixture: Mixture):
    end = settled(mixture)
    check_amounts(reactions_at(end, mixture.feed_amounts), end, mixture.feed_amounts, 1e-6)


@every_mixture
def test_quotient_is_K_at_an_end_state(mixture: Mixture):
    """Absent condensed species included: the proof gives their activity."""
    end = settled(mixture)
    for figures in reactions_at(end, mixture.feed_amounts).figures:
        assert figures.q_over_k == pytest.approx(1.0, abs=1e-9), figures.reaction.text
        assert figures.approach.approach == pytest.approx(0.0, abs=1e-6)
        absent = [sp.key for sp in figures.reaction.species if sp.key in end.proof.absent]
        noted = " ".join(figures.notes)
        assert all(f"{key}: absent" in noted for key in absent)


@pytest.mark.parametrize(
    "name", ["reformer", "lime kiln", "flame gas over carbon", "no gas at all"]
)
def test_all_species_can_be_taken_in(name: str):
    mixture = BY_NAME[name]
    small = [
        sp for sp in mixture.species if len(mixture.species) < 20 or sum(sp.elements.values()) < 5
    ]
    feed = mixture.feed_amounts
    end = solver.settle(small, feed, solver.Fixed("T,p", T=mixture.T, p=mixture.p))
    view = reactions_at(end, feed, share=0.0)
    check_set(view)
    assert not view.left_out
    assert view.extents.closed
    for figures in view.figures:
        assert figures.q_over_k == pytest.approx(1.0, abs=1e-9)


@pytest.mark.parametrize("seed", range(2000, 2030))
def test_random_mixture_has_a_readable_set(seed: int):
    problem = random_problem(seed)
    fixed = solver.Fixed("T,p", T=problem.T, p=problem.p)
    end = solver.settle(list(problem.species), problem.feed, fixed)
    view = reactions_at(end, problem.feed)
    check_set(view)
    check_amounts(view, end, problem.feed, 1e-6)
    for figures in view.figures:
        if figures.ln_q is not None and math.isfinite(figures.ln_q):
            assert figures.ln_q - figures.ln_k == pytest.approx(0.0, abs=1e-8), (
                figures.reaction.text
            )


@pytest.mark.parametrize("pair", ["H,p", "U,V"])
def test_quotient_is_K_in_adiabatic_vessels(pair: str):
    mixture = BY_NAME["reformer"]
    fed = solver.as_fed(mixture.feed_amounts, 1600.0, 1e6)
    fixed = (
        solver.Fixed("H,p", H=fed.H, p=1e6)
        if pair == "H,p"
        else solver.Fixed("U,V", U=fed.U, V=fed.V)
    )
    end = solver.settle(mixture.species, mixture.feed_amounts, fixed)
    for figures in reactions_at(end, mixture.feed_amounts).figures:
        assert figures.q_over_k == pytest.approx(1.0, abs=1e-9)


@pytest.mark.parametrize("share", [0.2, 0.7])
def test_quotient_is_K_on_a_plateau(share: float):
    """Water boiling alone and calcium carbonate under its own gas, energy held."""
    lib = library()
    water = {lib["H2O(l)"]: 1.0}
    chalk = {lib["CaCO3(s)"]: 1.0}
    for feed, others in ((water, ["H2O"]), (chalk, ["CaO(s)", "CO2"])):
        species = [*feed, *(lib[key] for key in others)]
        reaction = reactions_at(
            solver.settle(species, feed, solver.Fixed("T,p", T=2000.0, p=1e5)), feed
        ).reactions[0]
        T_eq = equilibrium_temperature(reaction, 0.0, 1000.0).T_eq
        assert T_eq is not None
        H = sum(n * sp.h(T_eq) for sp, n in feed.items()) + share * reaction.dh(T_eq)
        end = solver.settle(species, feed, solver.Fixed("H,p", H=H, p=1e5))
        (figures,) = reactions_at(end, feed).figures
        assert figures.extent == pytest.approx(share, abs=1e-9)
        assert figures.q_over_k == pytest.approx(1.0, abs=1e-9)
        assert end.T == pytest.approx(T_eq, abs=0.01)


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("reformer", {"CH4 + H2O = CO + 3 H2", "CO + H2O = CO2 + H2"}),
        ("lime kiln", {"CaCO3 = CaO(s) + CO2"}),
        ("ammonia converter", {"N2 + 3 H2 = 2 NH3"}),
        ("no gas at all", {"2 Al(s) + Fe2O3(s) = Al2O3(s) + 2 Fe(s)"}),
        ("water condensing from air", {"H2O = H2O(l)"}),
        (
            "burnt and cold, exact stoichiometry",
            {"CH4 + 2 O2 = 2 H2O(l) + CO2", "H2O(l) = H2O"},
        ),
    ],
)
def test_well_known_reactions_are_found(name: str, expected: set[str]):
    mixture = BY_NAME[name]
    found = {r.text for r in reactions_at(settled(mixture), mixture.feed_amounts).reactions}
    assert {text.replace("(calcite)", "") for text in found} == expected


def test_reactions_run_forward_the_main_one_first():
    for mixture in MIXTURES:
        view = reactions_at(settled(mixture), mixture.feed_amounts)
        extents = [f.extent for f in view.figures]
        assert all(x is not None and x >= 0.0 for x in extents)
        largest = [
            x * max(abs(float(nu)) for _, nu in f.reaction.terms)
            for x, f in zip(extents, view.figures, strict=True)
            if x is not None
        ]
        assert largest == sorted(largest, reverse=True)


def test_iron_oxide_of_odd_formula_is_written_in_short_decimals():
    mixture = BY_NAME["iron ore in reducing gas"]
    view = reactions_at(settled(mixture), mixture.feed_amounts)
    texts = [r.text for r in view.reactions if any(sp.key == "Fe0.947O(s)" for sp in r.species)]
    assert texts
    for text in texts:
        assert len(text) < 60
        assert "/" not in text
        assert parsed(text) in view.reactions


def test_users_set_gives_the_same_change():
    mixture = BY_NAME["reformer"]
    end = settled(mixture)
    own = parse_set(["CH4 + 2 H2O = CO2 + 4 H2", "CO2 + H2 -> CO + H2O"], end.species)
    view = reactions_at(end, mixture.feed_amounts, own)
    assert view.reactions == own
    assert view.complete
    assert view.extents.closed
    check_amounts(view, end, mixture.feed_amounts, 1e-6)
    assert all(f.q_over_k == pytest.approx(1.0, abs=1e-9) for f in view.figures)


def test_users_set_that_is_too_small_says_what_it_leaves():
    mixture = BY_NAME["reformer"]
    end = settled(mixture)
    view = reactions_at(end, mixture.feed_amounts, [parsed("CH4 + H2O = CO + 3 H2")])
    assert not view.complete
    assert view.extents.missing == 1
    assert not view.extents.closed
    assert {sp.key for sp in view.extents.unexplained} >= {"CO2", "CO"}
    # least squares: what is left has no share along the reaction
    rest = view.extents.unexplained
    numbers = view.reactions[0].numbers
    assert sum(float(nu) * rest.get(sp, 0.0) for sp, nu in numbers.items()) == pytest.approx(
        0.0, abs=1e-12
    )


def test_users_set_must_be_independent():
    mixture = BY_NAME["reformer"]
    shift = parsed("CO + H2O = CO2 + H2")
    with pytest.raises(InputError, match="follows from the others"):
        reactions_at(settled(mixture), mixture.feed_amounts, [shift, shift.reversed])


def test_species_that_is_no_candidate_goes_to_its_end():
    lib = library()
    feed = {lib["CH3OH"]: 1.0, lib["H2O"]: 1.0}
    keys = "CO CO2 H2 H2O"
    end = solver.settle([lib[k] for k in keys.split()], feed, solver.Fixed("T,p", T=550.0, p=1e5))
    view = reactions_at(end, feed)
    check_set(view)
    broken = [f for f in view.figures if any(sp.key == "CH3OH" for sp in f.reaction.species)]
    assert len(broken) == 1
    assert broken[0].extent == pytest.approx(1.0)
    assert broken[0].ln_q == math.inf
    assert broken[0].notes == ("CH3OH: not among the candidates",)
    assert broken[0].approach.T_eq is None
    assert "missing" in broken[0].approach.reason
    with pytest.raises(InputError) as caught:
        reactions_at(end, {"CH3OH": 1.0})
    assert caught.value.field == "feed[CH3OH]"


def test_extents_of_known_changes_come_back():
    rng = np.random.default_rng(11)
    texts = ["CO + H2O = CO2 + H2", "CH4 + H2O = CO + 3 H2", "C(gr) + CO2 = 2 CO"]
    reactions = [parsed(text) for text in texts]
    for _ in range(20):
        given = rng.uniform(-1.0, 1.0, 3) * 10.0 ** rng.integers(-6, 3, 3)
        feed = {sp: 1e4 for r in reactions for sp in r.species}
        amounts = dict(feed)
        for reaction, x in zip(reactions, given, strict=True):
            for sp, nu in reaction.terms:
                amounts[sp] += float(nu) * x
        found = extents_of(reactions, feed, amounts)
        assert found.closed
        np.testing.assert_allclose(found.values, given, atol=1e-11)


# -- approach to equilibrium ---------------------------------------------------------------------


def reformed(T: float) -> dict[Species, float]:
    """Reformer gas at equilibrium at T, mol."""
    lib = library()
    species = [lib[k] for k in "CH4 H2O CO CO2 H2".split()]
    end = solver.settle(species, {"CH4": 1.0, "H2O": 3.0}, solver.Fixed("T,p", T=T, p=2.4e6))
    return {sp: end.amounts[sp.key] for sp in species}


@pytest.mark.parametrize("text", ["CH4 + H2O = CO + 3 H2", "CO + H2O = CO2 + H2"])
def test_gas_that_lags_behind_shows_how_far_it_lags(text: str):
    """A composition of equilibrium at 1080 K, measured at 1120 K: an approach of +40 K."""
    found = reaction_figures(parsed(text), reformed(1080.0), 1120.0, 2.4e6).approach
    assert found.T_eq == pytest.approx(1080.0, abs=1e-6)
    assert found.approach == pytest.approx(40.0, abs=1e-6)
    assert found.shift == pytest.approx(-40.0, abs=1e-6)


@pytest.mark.parametrize(
    ("text", "feed", "T", "positive"),
    [
        ("CH4 + H2O = CO + 3 H2", {"CH4": 1.0, "H2O": 3.0}, 1100.0, True),
        ("2 SO2 + O2 = 2 SO3", {"SO2": 1.0, "O2": 1.2, "N2": 9.0}, 800.0, False),
        ("N2 + 3 H2 = 2 NH3", {"N2": 1.0, "H2": 3.0}, 700.0, False),
    ],
)
def test_sign_of_approach(text: str, feed: dict[str, float], T: float, positive: bool):
    """Short of equilibrium: positive where the reaction takes up heat, negative where not."""
    reaction, p = parsed(text), 1e6
    full = solver.reactions.hand_calculation(
        reaction, feed_of(**feed), solver.Fixed("T,p", T=T, p=p)
    )
    amounts = {sp: feed.get(sp.key, 0.0) for sp in (*reaction.species, *feed_of(**feed))}
    for sp, nu in reaction.terms:
        amounts[sp] += 0.8 * full.extent * float(nu)
    figures = reaction_figures(reaction, amounts, T, p, feed=feed_of(**feed))
    assert figures.extent == pytest.approx(0.8 * full.extent)
    assert figures.q_over_k is not None
    assert figures.q_over_k < 1.0
    approach = figures.approach.approach
    assert approach is not None
    assert (approach > 0.0) is positive is (figures.dh > 0.0)
    assert figures.approach.T_eq is not None
    assert reaction.ln_k(figures.approach.T_eq) == pytest.approx(figures.ln_q, abs=1e-10)


def test_K_at_the_shifted_temperature_is_the_quotient():
    """What a restriction needs: K taken at T + shift equals Q."""
    reaction = parsed("CH4 + H2O = CO + 3 H2")
    figures = reaction_figures(reaction, reformed(1000.0), 1150.0, 2.4e6)
    assert figures.approach.shift is not None
    assert reaction.ln_k(1150.0 + figures.approach.shift) == pytest.approx(figures.ln_q, abs=1e-10)


def test_no_temperature_gives_such_a_quotient():
    reaction = parsed("N2 + O2 = 2 NO")
    amounts = feed_of(N2=1e-4, O2=1e-4, NO=1.0)
    found = reaction_figures(reaction, amounts, 1500.0, 1e5).approach
    assert found.T_eq is found.approach is found.shift is None
    assert "no temperature from" in found.reason


def test_missing_species_leave_no_approach():
    shift = parsed("CO + H2O = CO2 + H2")
    none = reaction_figures(shift, feed_of(CO=1.0, H2O=1.0), 700.0, 1e5)
    assert none.ln_q == -math.inf
    assert none.q_over_k == 0.0
    assert "products is missing" in none.approach.reason
    both = reaction_figures(shift, feed_of(CO=1.0, H2=1.0), 700.0, 1e5)
    assert both.ln_q is None
    assert both.q_over_k is None


def test_absent_carbon_needs_its_activity():
    reaction = parsed("C(gr) + CO2 = 2 CO")
    gas = feed_of(CO=0.3, CO2=0.1, N2=0.6)
    unknown = reaction_figures(reaction, gas, 1000.0, 1e5)
    assert unknown.ln_q is None
    assert "C(gr): absent; activity not known" in unknown.approach.reason
    about_to_form = reaction_figures(reaction, gas, 1000.0, 1e5, absent={"C(gr)": 1.0})
    assert about_to_form.ln_q == pytest.approx(math.log(0.3**2 / 0.1), rel=1e-3)
    assert any("as given" in note for note in about_to_form.notes)
    present = reaction_figures(reaction, gas | feed_of(**{"C(gr)": 1.0}), 1000.0, 1e5)
    assert present.ln_q == pytest.approx(about_to_form.ln_q, abs=1e-12)


def test_unknown_gas_models_are_refused():
    with pytest.raises(InputError) as caught:
        reaction_figures(parsed("N2 + O2 = 2 NO"), feed_of(N2=1.0, O2=1.0), 900.0, 1e5, gas="thin")
    assert caught.value.field == "gas"


@pytest.mark.parametrize("gas", ["srk", "pr"])
def test_real_gas_reactions_close_with_fugacities(gas):
    """Q of fugacities equals K in a high-pressure converter; y p alone would be far off."""
    lib = library()
    species = [lib[key] for key in ("N2", "H2", "NH3")]
    end = solver.settle(
        species, {"N2": 1.0, "H2": 3.0}, solver.Fixed("T,p", T=700.0, p=3e7), gas=gas
    )
    view = reactions_at(end, {"N2": 1.0, "H2": 3.0})
    assert view.figures[0].ln_q == pytest.approx(view.figures[0].ln_k, abs=1e-9)
    amounts = {sp: end.amounts[sp.key] for sp in species}
    reaction = view.figures[0].reaction
    assert reaction_figures(reaction, amounts, 700.0, 3e7, gas=gas).ln_q == pytest.approx(
        reaction.ln_k(700.0), abs=1e-9
    )
    assert abs(reaction_figures(reaction, amounts, 700.0, 3e7).ln_q - reaction.ln_k(700.0)) > 0.1


def test_reactions_close_beside_a_fluid_liquid():
    """Reactions among species of gas and liquid, and the pure liquid that was left out."""
    lib = library()
    species = [lib[key] for key in ("CO", "CO2", "H2", "H2O", "H2O(l)", "CH4")]
    feed = {"CO": 1.0, "H2": 2.2, "H2O": 2.1}
    end = solver.settle(species, feed, solver.Fixed("T,p", T=450.0, p=3e6), gas="pr")
    assert "liquid" in end.phases
    for figures in reactions_at(end, feed).figures:
        assert figures.ln_q == pytest.approx(figures.ln_k, abs=1e-9)
    condensing = reactions_at(end, feed, [parsed("H2O = H2O(l)")]).figures[0]
    assert any("left out" in note for note in condensing.notes)
    assert condensing.ln_q == pytest.approx(condensing.ln_k, abs=1e-9)


def test_quotient_follows_pressure_and_inerts():
    """Q of N2 + 3 H2 = 2 NH3 falls with the square of the pressure."""
    reaction = parsed("N2 + 3 H2 = 2 NH3")
    amounts = feed_of(N2=1.0, H2=2.0, NH3=0.5)
    one, ten = (reaction_figures(reaction, amounts, 700.0, p).ln_q for p in (1e5, 1e6))
    total = 3.5
    by_hand = math.log((0.5 / total) ** 2 / ((1.0 / total) * (2.0 / total) ** 3))
    assert one == pytest.approx(by_hand, abs=1e-12)
    assert ten == pytest.approx(by_hand - 2.0 * math.log(10.0), abs=1e-12)


@pytest.mark.parametrize(
    ("amounts", "T", "p", "field"),
    [
        ({"CO": -1.0, "H2O": 1.0}, 700.0, 1e5, "amounts[CO]"),
        ({"CO": math.nan, "H2O": 1.0}, 700.0, 1e5, "amounts[CO]"),
        ({"CO": 1.0, "H2O": 1.0}, 10.0, 1e5, "fixed.T"),
        ({"CO": 1.0, "H2O": 1.0}, 700.0, -1.0, "fixed.p"),
    ],
)
def test_impossible_measurements_are_refused(
    amounts: dict[str, float], T: float, p: float, field: str
):
    with pytest.raises(InputError) as caught:
        reaction_figures(parsed("CO + H2O = CO2 + H2"), feed_of(**amounts), T, p)
    assert caught.value.field == field


def test_figures_of_a_reaction_hang_together():
    view = reactions_at(settled(BY_NAME["reformer"]), BY_NAME["reformer"].feed_amounts)
    for f in view.figures:
        assert f.dg == pytest.approx(f.dh - f.T * f.ds, rel=1e-9)
        assert f.dg298 == pytest.approx(f.dh298 - 298.15 * f.ds298, rel=1e-9)
        assert f.ln_k == pytest.approx(-f.dg / (R * f.T), rel=1e-12)
        assert f.k == pytest.approx(math.exp(f.ln_k))
        assert f.q == pytest.approx(f.k, rel=1e-9)


def test_of_several_temperatures_the_nearest_is_taken():
    """The enthalpy of this reaction passes zero near 1040 K, where K has its extreme."""
    reaction = parsed("H2S + CO = COS + H2")
    assert reaction.dh(900.0) * reaction.dh(1200.0) < 0.0
    low = equilibrium_temperature(reaction, reaction.ln_k(900.0), 950.0)
    assert low.T_eq == pytest.approx(900.0, abs=1e-6)
    assert "also at" in low.reason
    high = equilibrium_temperature(reaction, reaction.ln_k(900.0), 1250.0)
    assert high.T_eq is not None
    assert high.T_eq > 1040.0
    assert reaction.ln_k(high.T_eq) == pytest.approx(reaction.ln_k(900.0), abs=1e-12)


def test_temperature_of_boiling():
    reaction = parsed("H2O(l) = H2O")
    found = equilibrium_temperature(reaction, 0.0, 350.0)
    assert found.T_eq is not None
    # boiling point of water at 1 bar: 372.76 K, IAPWS-95; an ideal vapour comes 0.4 K higher
    assert found.T_eq == pytest.approx(372.76, abs=0.6)


@pytest.mark.parametrize("power", [1, 3, 9])
def test_bracketed_root_closes_to_the_last_digits(power: int):
    root = bracketed_root(lambda x: x**power - 2.0, 0.0, 10.0, -2.0, 10.0**power - 2.0)
    assert root == pytest.approx(2.0 ** (1.0 / power), rel=4e-16)


def test_bracketed_root_finds_a_jump_and_wants_a_bracket():
    at = bracketed_root(lambda x: math.copysign(math.inf, x - 0.3), -1.0, 1.0, -math.inf, math.inf)
    assert at == pytest.approx(0.3, rel=1e-14)
    with pytest.raises(ValueError, match="same sign"):
        bracketed_root(lambda x: x, 1.0, 2.0, 1.0, 2.0)
