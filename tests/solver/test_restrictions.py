"""What is held back stays held back, costs free energy, and the rest is still at its best."""

import numpy as np
import pytest

import solver
import species_db
from solver import Fixed, FixedConversion, HeldApproach, Inert, InputError, NoExchange
from solver.reactions import Reaction

LIB = species_db.load()
KEYS = ("CH4", "H2O", "CO", "CO2", "H2", "N2", "NH3", "C(gr)")
SPECIES = [LIB[key] for key in KEYS]
FEED = {"CH4": 1.0, "H2O": 2.5, "N2": 0.2}
FIXED = Fixed("T,p", T=1050.0, p=20e5)
REFORMING = Reaction.parse("CH4 + H2O = CO + 3 H2", LIB)
SHIFT = Reaction.parse("CO + H2O = CO2 + H2", LIB)


def settled(*restrictions, fixed=FIXED):
    return solver.settle(SPECIES, FEED, fixed, restrictions=restrictions)


def log_quotient(end, reaction):
    return sum(float(nu) * np.log(end.fraction(sp.key) * end.p / 1e5) for sp, nu in reaction.terms)


def test_whole_species_inert():
    end = settled(Inert("N2"))
    assert end.amounts["N2"] == pytest.approx(0.2, rel=1e-14)
    assert end.amounts["NH3"] == 0.0


@pytest.mark.parametrize("limit", [Inert("CH4", share=0.25), Inert("CH4", amount=0.25)])
def test_inert_part_dilutes_the_rest(limit):
    """Three quarters of the methane, in a gas with as much more of something inert."""
    end = settled(limit)
    stand_in = LIB["Ar"]
    rest = solver.settle(
        [*SPECIES, stand_in], {"CH4": 0.75, "H2O": 2.5, "N2": 0.2, "Ar": 0.25}, FIXED
    )
    assert end.amounts["CH4"] == pytest.approx(0.25 + rest.amounts["CH4"], rel=1e-12)
    assert end.amounts["H2"] == pytest.approx(rest.amounts["H2"], rel=1e-12)


@pytest.mark.parametrize("conversion", [0.0, 0.3, 0.62, 0.9])
def test_conversion_is_kept_and_the_rest_is_at_equilibrium(conversion):
    end = settled(FixedConversion("CH4", conversion), fixed=Fixed("T,p", T=1200.0, p=5e5))
    assert end.amounts["CH4"] == pytest.approx(1.0 - conversion, abs=1e-13)
    if conversion:
        assert log_quotient(end, SHIFT) == pytest.approx(SHIFT.ln_k(end.T), abs=1e-9)


def test_conversion_that_is_the_equilibrium_costs_nothing():
    free = settled()
    end = settled(FixedConversion("CH4", 1.0 - free.amounts["CH4"]))
    (cost,) = end.proof.restrictions
    assert abs(cost.energy) < 1e-6
    assert end.amounts["CO"] == pytest.approx(free.amounts["CO"], rel=1e-7)


@pytest.mark.parametrize("dT", [-40.0, -10.0, 15.0])
def test_approach_moves_one_reaction_alone(dT):
    end = settled(HeldApproach(REFORMING, dT))
    assert log_quotient(end, REFORMING) == pytest.approx(REFORMING.ln_k(end.T + dT), abs=1e-10)
    assert log_quotient(end, SHIFT) == pytest.approx(SHIFT.ln_k(end.T), abs=1e-10)


def test_two_approaches_at_once():
    end = settled(HeldApproach(REFORMING, -30.0), HeldApproach(SHIFT, 8.0, key="CO2"))
    assert log_quotient(end, REFORMING) == pytest.approx(REFORMING.ln_k(end.T - 30.0), abs=1e-10)
    assert log_quotient(end, SHIFT) == pytest.approx(SHIFT.ln_k(end.T + 8.0), abs=1e-10)


def test_groups_keep_their_elements():
    end = settled(NoExchange({"N2", "NH3"}))
    assert end.amounts["N2"] == pytest.approx(0.2, rel=1e-14)  # no hydrogen reaches the group


def test_groups_share_the_gas():
    """Two separate lots of dissociating CO2, seen from inside, are one gas."""
    species = [LIB[key] for key in ("CO2", "CO", "O2", "NO2", "NO", "N2")]
    feed = {"CO2": 1.0, "NO2": 1.0}
    fixed = Fixed("T,p", T=2800.0, p=1e5)
    nitrogen = {"NO2", "NO", "N2"}
    end = solver.settle(species, feed, fixed, restrictions=[NoExchange(nitrogen)])
    oxygen = 2 * end.amounts["CO2"] + end.amounts["CO"] + 2 * end.amounts["O2"]
    assert oxygen == pytest.approx(2.0, rel=1e-13)


@pytest.mark.parametrize(
    "restrictions",
    [
        (Inert("N2"),),
        (Inert("CH4", share=0.4),),
        (FixedConversion("CH4", 0.3),),
        (HeldApproach(REFORMING, -25.0),),
        (NoExchange({"N2", "NH3"}),),
        (Inert("N2"), FixedConversion("CH4", 0.5), HeldApproach(SHIFT, 10.0)),
    ],
    ids=lambda r: " & ".join(map(str, r)),
)
@pytest.mark.parametrize("pair", ["T,p", "H,p", "U,V"])
def test_proof_states_what_holds_and_its_cost(restrictions, pair):
    fed = solver.as_fed({LIB[k]: n for k, n in FEED.items()}, 1300.0, 20e5)
    values = {"T,p": {"T": 1050.0, "p": 20e5}, "H,p": {"H": fed.H, "p": fed.p}}
    values["U,V"] = {"U": fed.U, "V": fed.V}
    end = settled(*restrictions, fixed=Fixed(pair, **values[pair]))
    assert end.proof.holds
    assert [c.restriction for c in end.proof.restrictions] == [str(r) for r in restrictions]
    for cost in end.proof.restrictions:
        assert cost.energy > -1e-6 * abs(end.T)  # J; a restriction never helps


PAIRED = [
    (Inert("CH4", share=0.4), HeldApproach(REFORMING, 100.0)),
    (Inert("CH4", share=0.4), HeldApproach(SHIFT, -100.0, key="CO2")),
    (Inert("H2O", share=0.05), Inert("CH4", share=0.4)),
    (HeldApproach(REFORMING, -100.0), HeldApproach(SHIFT, -100.0, key="CO2")),
    (FixedConversion("CH4", 0.9), Inert("N2", share=0.9)),
]


@pytest.mark.parametrize("restrictions", PAIRED, ids=lambda r: " & ".join(map(str, r)))
@pytest.mark.parametrize("pair", ["T,p", "H,p", "U,V"])
def test_no_restriction_helps_beside_another(restrictions, pair):
    """G alone may fall, as the other one does not seek the least G: that is no gain of this one."""
    fed = solver.as_fed({LIB[k]: n for k, n in FEED.items()}, 1300.0, 20e5)
    values = {"T,p": {"T": 900.0, "p": 20e5}, "H,p": {"H": fed.H, "p": fed.p}}
    values["U,V"] = {"U": fed.U, "V": fed.V}
    end = settled(*restrictions, fixed=Fixed(pair, **values[pair]))
    for cost in end.proof.restrictions:
        assert cost.energy > 1e-3  # J; each of these does hold the mixture back


def test_cost_beside_a_whole_inert_species_is_that_in_gibbs_energy():
    both = settled(Inert("N2"), FixedConversion("CH4", 0.5))
    one = settled(Inert("N2"))
    assert both.proof.restrictions[1].energy == pytest.approx(both.G - one.G, rel=1e-9)


def test_batch_obeys_the_same():
    T = np.linspace(900.0, 1300.0, 50)
    held = (HeldApproach(REFORMING, -20.0), Inert("N2"))
    ends = solver.settle_many(SPECIES, FEED, "T,p", T, 20e5, restrictions=held)
    assert ends.settled.all()
    for i in (0, 20, 49):
        one = solver.settle(SPECIES, FEED, Fixed("T,p", T=T[i], p=20e5), restrictions=held)
        np.testing.assert_allclose(ends.amounts[i], list(one.amounts.values()), atol=1e-12)


@pytest.mark.parametrize(
    ("make", "field", "said"),
    [
        (lambda: settled(Inert("CO")), "restrictions[CO]", "not fed"),
        (lambda: settled(Inert("CH4", amount=3.0)), "restrictions[CH4]", "only 1 mol"),
        (lambda: settled(Inert("C2H6")), "restrictions[C2H6]", "no candidate"),
        (lambda: FixedConversion("CH4", 1.2), "restrictions[CH4]", "0 to 1"),
        (lambda: Inert("CH4", share=-0.1), "restrictions[CH4]", "0 to 1"),
        (lambda: Inert("CH4", share=0.1, amount=0.1), "restrictions[CH4]", "give one"),
        (
            lambda: settled(Inert("CH4"), FixedConversion("CH4", 0.5)),
            "restrictions[CH4]",
            "restricted twice",
        ),
        (
            lambda: settled(NoExchange({"N2", "NH3"}), NoExchange({"N2", "CO"})),
            "restrictions[N2]",
            "two groups",
        ),
        (
            lambda: settled(HeldApproach(REFORMING, 0.0), HeldApproach(REFORMING, 5.0)),
            "restrictions.approach",
            "key",
        ),
        (lambda: HeldApproach(REFORMING, float("nan")), "restrictions.approach", "-1000 to"),
        (
            lambda: solver.settle(
                [LIB["CO2"], LIB["CO"]],
                {"CO2": 1.0},
                FIXED,
                restrictions=[FixedConversion("CO2", 0.5)],
            ),
            "species",
            "loosen the restrictions",
        ),
    ],
)
def test_contradictions_are_refused(make, field, said):
    with pytest.raises(InputError) as caught:
        make()
    assert caught.value.field == field
    assert said in str(caught.value)
