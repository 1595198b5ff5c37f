"""The audit over every record of the library."""

from collections import Counter, defaultdict

import numpy as np
import pytest

from species_db import R, Segment, Species, audit, molar_mass


def test_no_record_has_a_fault(records):
    faults = audit.check_library(records)
    assert not faults, "\n".join(str(f) for f in faults[:40])


def test_reference_states_are_in_the_library_and_exactly_zero(lib):
    for key in audit.REFERENCE_STATES:
        assert lib[key].key == key
        assert abs(lib[key].h(298.15)) < 1e-3
        assert lib[key].h298_uncertainty == 0.0


def test_enough_substances(records):
    neutral = [s for s in records if not s.charge]
    gases = [s for s in neutral if s.phase == "gas"]
    condensed = [s for s in neutral if s.phase != "gas"]
    assert len(gases) >= 1500
    assert len(condensed) >= 500
    assert len({tuple(sorted(s.elements.items())) for s in condensed}) >= 500


def test_chained_transitions_are_exact(records):
    seen = 0
    for sp in records:
        for t in sp.transitions:
            below, above = sp.g(np.nextafter(t.T, 0.0)), sp.g(t.T)
            assert abs(above - below) < 1e-3, sp.key
            jump = sp.h(t.T) - sp.h(np.nextafter(t.T, 0.0))
            assert jump == pytest.approx(t.latent_heat, abs=1e-2), sp.key
            seen += 1
    assert seen > 80


def _by_composition(records):
    groups = defaultdict(lambda: {"solid": [], "liquid": []})
    for sp in records:
        if sp.phase != "gas":
            groups[tuple(sorted(sp.elements.items()))][sp.phase].append(sp)
    return groups


def test_solid_and_liquid_trade_places_once_at_most(records):
    """Below the melting point the liquid, above it no solid, is the more stable one.

    From 250 K up: below, both are carried on with constant cp far outside their data.
    """
    T = np.arange(250.0, 6000.0, 8.0)
    pairs = 0
    for group in _by_composition(records).values():
        for liquid in group["liquid"]:
            organic = {"C", "H"} <= set(liquid.elements)
            solids = [s for s in group["solid"] if not organic or s.cas == liquid.cas]
            if not solids:
                continue
            gap = np.min([s.g(T) for s in solids], axis=0) - liquid.g(T)
            turns = T[:-1][np.diff(np.sign(gap)) != 0]
            assert len(turns) <= 1, (liquid.key, turns)
            assert gap[-1] > 0, liquid.key
            pairs += 1
    assert pairs > 150


def test_no_two_records_of_one_substance(records):
    """Same elements, charge, state and CAS number: only isomers known to share a number."""
    seen = Counter(
        (tuple(sorted(s.elements.items())), s.charge, s.phase, s.cas)
        for s in records
        if s.cas and "CAS shared by several gases" not in s.flags
    )
    forms = {(c, q, p, cas): n for (c, q, p, cas), n in seen.items() if n > 1 and p != "solid"}
    assert not forms


def test_every_record_names_its_source(records):
    for sp in records:
        assert sp.source in {"burcat", "janaf", "trc", "crc", "crc+perry", "hand"}
        assert sp.reference
        assert sp.h298_uncertainty is not None
        assert sp.h298_uncertainty_kind


def test_second_source_is_on_the_same_datum(lib, records):
    seconds = [s for s in records if s.second]
    assert len(seconds) > 300
    water = lib["H2O"].second
    assert water is not None
    assert water.h298 == pytest.approx(-241826.0, abs=5.0)  # NIST-JANAF table H-064
    assert water.g[2] == pytest.approx(lib["H2O"].g(1000.0), abs=200.0)


def test_critical_constants_are_plausible(records):
    gases = [s for s in records if s.Tc is not None]
    assert len(gases) > 700
    for sp in gases:
        assert 3.0 < sp.Tc < 2500.0, sp.key
        assert 1.0e5 < sp.pc < 5.0e7, sp.key
        assert -0.6 < sp.acentric < 2.0, sp.key


def test_molar_volumes_give_plausible_densities(records):
    """Densities of condensed substances lie between liquid hydrogen and osmium."""
    known = [s for s in records if s.molar_volume is not None]
    assert len(known) > 500
    for sp in known:
        assert 300.0 < sp.molar_mass / sp.molar_volume < 22700.0, sp.key


def test_audit_finds_planted_faults():
    elements = {"O": 2}

    def record(*segments, transitions=()):
        return Species(
            "X", "planted", elements, 0, "gas", segments, molar_mass(elements), transitions,
            source="hand", reference="planted",
        )  # fmt: skip

    good = (3.5, 0.0, 0.0, 0.0, 0.0, -1043.5, 4.0)
    assert not audit.check(record(Segment(200.0, 6000.0, good)))
    falling = (3.5, -1e-3, 0.0, 0.0, 0.0, -1043.5, 4.0)
    whats = [f.what for f in audit.check(record(Segment(200.0, 6000.0, falling)))]
    assert "cp above zero over the range" in whats
    step = (3.5, 0.0, 0.0, 0.0, 0.0, -1043.5 + 5.0, 4.0)
    broken = record(Segment(200.0, 1000.0, good), Segment(1000.0, 6000.0, step))
    assert any("h continuous" in f.what for f in audit.check(broken))
    heavy = Species("X", "x", elements, 0, "gas", broken.segments[:1], 0.033, reference="planted")
    assert any("molar mass" in f.what for f in audit.check(heavy))
    assert R == pytest.approx(8.314462618, abs=1e-12)


def test_fits_follow_their_tables(records):
    """Fits poorer than 0.02 in g/RT are flagged: four tables, all with misprints or cp peaks."""
    poor = {s.key for s in records if any(f.startswith("fit poor") for f in s.flags)}
    assert poor == {"K2B4O7(l)", "Hf(l)", "Cr2O3(s)", "PbF2(s)"}
