"""Keeps solid and liquid of a substance from trading places far from the melting point.

Outside its range a record holds cp constant. Where a solid's cp peaks before melting, or a liquid
is carried far below it, that alone would let the solid come back above the melting point or the
liquid below. There the solid goes on with the liquid's cp above the melting point, the liquid with
the solid's cp below the end of its table: the differences in h and s stay what they are at the end
of the data. Only records that need it are extended; each is flagged.
"""

import numpy as np

from species_db.build.chain import cut
from species_db.build.draft import Draft, LeftOut
from species_db.build.poly import T0, Piece, g_at, h_at, s_at

T_GRID = np.arange(205.0, 6001.0, 5.0)
CLEAR = 15.0
"""Distance from the melting point within which nothing is asked, K."""


METASTABLE_REFERENCE = {(("P", 1.0),)}
"""Elements whose reference state (white phosphorus) is not their stable form."""


def keep_apart(drafts: list[Draft]) -> None:
    """Extend the pairs that need it, in place."""
    solids: dict[object, list[Draft]] = {}
    for d in drafts:
        if d.phase == "solid":
            solids.setdefault((d.identity, d.origin), []).append(d)
    for liquid in drafts:
        if liquid.phase != "liquid" or not liquid.tied:
            continue
        same = [
            s
            for s in solids.get((liquid.identity, liquid.origin), [])
            if abs(s.T_max - liquid.t_fusion) < 1.0
        ]
        if not same:
            continue
        solid = min(same, key=lambda s: g_at(s.pieces, liquid.t_fusion))
        gap = np.array([g_at(solid.pieces, t) - g_at(liquid.pieces, t) for t in T_GRID])
        if np.any(gap[T_GRID > liquid.t_fusion + CLEAR] <= 0):
            _extend_solid(solid, liquid)
        low = max(T0, solid.T_min)
        if np.any(gap[T_GRID < liquid.t_fusion - CLEAR] >= 0) and liquid.T_min > low:
            _extend_liquid(liquid, solid, low)


def _moved(pieces: list[Piece], onto: list[Piece], at: float) -> list[Piece]:
    """Pieces shifted so that h and s agree with `onto` at a temperature."""
    dh = h_at(onto, at) - h_at(pieces, at)
    ds = s_at(onto, at) - s_at(pieces, at)
    return [p.shifted(dh, ds) for p in pieces]


def _extend_solid(solid: Draft, liquid: Draft) -> None:
    top = solid.T_max
    above = cut(liquid.pieces, low=top)
    if above:
        above[0] = Piece(top, above[0].high, above[0].a)
        solid.pieces = solid.pieces + _moved(above, [solid.pieces[-1]], top)
        solid.flags.append(f"above {top:g} K with the cp of its liquid")


def _extend_liquid(liquid: Draft, solid: Draft, low: float) -> None:
    end = liquid.T_min
    below = cut(solid.pieces, low=low, high=end)
    joined: list[Piece] = list(liquid.pieces)
    for piece in reversed(below):  # latent heats of the solid's forms are no part of the liquid
        joined = _moved([piece], joined[:1], piece.high) + joined
    liquid.pieces = joined
    liquid.flags.append(f"below {end:g} K with the cp of its solid")


def drop_undercutting(drafts: list[Draft], out: list[LeftOut]) -> list[Draft]:
    """Drop a metastable form whose g undercuts the stable sequence of its own source.

    The sequence is what the source says is stable; a form that would replace it in its own range
    contradicts the source (high cristobalite above the quartz that melts metastably is no such
    case: the source's quartz ends where it melts).
    """
    sequences = {(d.identity, d.origin): d for d in drafts if d.phase == "solid" and d.is_sequence}
    kept = []
    for d in drafts:
        sequence = sequences.get((d.identity, d.origin))
        apart = d.form == "Cristobalite" or d.identity[0] in METASTABLE_REFERENCE
        if d.phase == "solid" and sequence and d is not sequence and not apart:
            grid = np.arange(T0, min(d.T_max, sequence.T_max), 10.0)
            least = min(g_at(d.pieces, t) - g_at(sequence.pieces, t) for t in grid)
            if least < -1e-3:
                reason = "form undercuts the stable sequence of its own source"
                out.append(LeftOut(d.origin, d.rid, d.label, d.phase, reason))
                continue
        kept.append(d)
    return kept
