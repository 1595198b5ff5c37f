"""Answers as JSON for other programs: stable keys, SI units, every digit.

Top level: ``format`` ("thalweg-answer"), ``version``, ``title``, ``cases``. Each case has
``name``, ``pair``, and either ``error`` or the answer:

- ``basis``: "batch", or "flow": then every extensive value is per second (J/s, mol/s, m3/s);
- ``T`` K, ``p`` Pa, ``V`` m3, ``H`` ``U`` ``G`` J, ``S`` J/K;
- ``heat`` J: taken up from outside, H_end - H_fed at fixed p and U_end - U_fed at fixed V;
  ``heat_is`` says "heat", "work" (S held as fed) or "heat and work" (S held at another value);
- ``fed``: ``T`` ``p`` (null where the streams differ), ``V H U S``, ``mass`` kg, ``amount`` mol,
  ``amounts`` mol by species;
- ``amounts``: mol of every candidate by key; ``fractions``: mole fraction in its phase;
- ``phases``: mol of the gas, of each liquid of the equation of state ("liquid", "second liquid")
  and of each condensed species present;
- ``gas``: ``model`` ("ideal", "srk", "pr"), ``name``, and what only an equation of state has:
  ``interactions`` (each k_ij in use: ``a``, ``b``, ``k``, ``source``; all others are zero),
  ``fluids`` (mol of every gas species in each fluid phase present), ``left_out`` (pure liquids that
  its own liquid stands for, to their gas species), ``taken_as_ideal`` (species without usable
  critical constants) and ``cautions`` (where the model is poor here);
- ``proof``: ``element_residual``, ``energy_residual``, ``gap`` (all relative), ``absent``
  (activity of each condensed candidate that did not form), ``model``, ``rigorous`` (whether the
  gap is a bound), ``stationarity``, ``tangent_distance`` (over RT) and ``starts`` of the
  tangent-plane test (null, null and 0 for an ideal gas), and ``restrictions``: for
  each its ``field`` in the project, ``text``, and ``cost``: J by which the free energy would lie
  lower without it (null where that could not be settled), of ``cost_is`` "Gibbs energy" at the T
  and p reached, or "Helmholtz energy" at the T and V;
- ``outside_range``: species present whose data do not reach the end temperature;
- ``messages``, ``cautions``: sentences;
- ``reactions``, only where asked for: ``own`` (whether the set is that of the project), ``list``,
  ``missing`` (how many more independent reactions the species present allow), ``unexplained`` (mol
  of each species that the set does not account for) and ``left_out`` (mol of each species present
  in traces only). Each of the list has ``equation``, ``numbers`` (stoichiometric, products
  positive), ``extent`` mol, ``ln_k`` and ``ln_q`` (1 bar), ``q_over_k``, ``dh`` ``dg`` J/mol and
  ``ds`` ``dcp`` J/(mol K) at T, ``dh298`` ``dg298`` ``ds298``, ``t_eq`` K (where K equals Q),
  ``approach`` K (T less t_eq) and ``notes``; null where there is no such figure;
- ``beside_ideal``, only where asked for: the same case with an ideal gas: ``T p V H U S G heat``
  and ``phases`` as above, ``shares`` (mole fractions of the main species: ``real``, ``ideal``,
  and what they are fractions ``of``: "gas" or "all"), or an ``error`` as below; null where the gas
  of the case is ideal.

``error`` has ``kind`` ("input", "no end state", "not proven") and ``faults``, each with
``field``, ``text``, ``value``, ``allowed``.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, Final

from solver.errors import InputError, NoEndState, SettleError
from solver.fixed import PAIRS
from solver.project.beside import CaseBeside
from solver.project.case import CaseAnswer
from solver.project.cautions import cautions
from solver.project.gas import pairs_of
from solver.project.model import Case, Project
from solver.reactions import Figures, ReactionsView

VERSION: Final = 1


def answers(
    project: Project,
    results: Sequence[tuple[Case, CaseAnswer | SettleError]],
    reactions: Sequence[ReactionsView | None] | None = None,
    beside: Sequence[CaseBeside | SettleError | None] | None = None,
) -> dict[str, Any]:
    """The whole document, made of plain Python values.

    Parameters
    ----------
    project
        Where the cases are from.
    results
        Each case with its answer, or with what stood in the way.
    reactions
        One for each case, or None where there is none; left out where they were not asked for.
    beside
        The ideal answer of each case, what stood in its way, or None where the gas is ideal; left
        out where it was not asked for.
    """
    views = [None] * len(results) if reactions is None else reactions
    besides = [None] * len(results) if beside is None else beside
    return {
        "format": "thalweg-answer",
        "version": VERSION,
        "title": project.title,
        "cases": [
            {
                "name": case.name,
                "pair": case.fixed.pair,
                **(_error(found) if isinstance(found, SettleError) else _answer(found)),
                **({} if view is None else {"reactions": _reactions(found, view)}),
                **({} if beside is None else {"beside_ideal": _beside(other)}),
            }
            for (case, found), view, other in zip(results, views, besides, strict=True)
        ],
    }


def _error(error: SettleError) -> dict[str, Any]:
    kind = (
        "input"
        if isinstance(error, InputError)
        else "no end state"
        if isinstance(error, NoEndState)
        else "not proven"
    )
    faults = getattr(error, "faults", (error,))
    return {
        "error": {
            "kind": kind,
            "faults": [
                {
                    "field": fault.field,
                    "text": str(fault),
                    "value": _plain(fault.value),
                    "allowed": str(fault.allowed),
                }
                for fault in faults
            ],
        }
    }


def _plain(value: object) -> object:
    return value if isinstance(value, str | int | float | None) else str(value)


def _answer(answer: CaseAnswer) -> dict[str, Any]:
    end, fed, proof = answer.end, answer.fed, answer.end.proof
    return {
        "basis": answer.basis,
        "T": end.T,
        "p": end.p,
        "V": end.V,
        "H": end.H,
        "U": end.U,
        "S": end.S,
        "G": end.G,
        "heat": answer.heat,
        "heat_is": answer.heat_is,
        "fed": {
            "T": fed.T,
            "p": fed.p,
            "V": fed.V,
            "H": fed.H,
            "U": fed.U,
            "S": fed.S,
            "mass": fed.mass,
            "amount": fed.amount,
            "amounts": {sp.key: n for sp, n in answer.prepared.feed.items()},
        },
        "amounts": dict(end.amounts),
        "fractions": {key: end.fraction(key) for key in end.amounts},
        "phases": dict(end.phase_amounts),
        "gas": _gas(answer),
        "proof": {
            "element_residual": proof.element_residual,
            "energy_residual": proof.energy_residual,
            "gap": proof.gap,
            "absent": dict(proof.absent),
            "model": proof.model,
            "rigorous": proof.rigorous,
            "stationarity": proof.stationarity,
            "tangent_distance": proof.tangent_distance,
            "starts": proof.starts,
            "restrictions": [
                {
                    "field": field,
                    "text": cost.restriction,
                    "cost": _finite(cost.energy),
                    "cost_is": cost_is(answer),
                }
                for field, cost in zip(
                    answer.prepared.restriction_fields, proof.restrictions, strict=True
                )
            ],
        },
        "outside_range": list(end.outside_range),
        "messages": list(answer.messages),
        "cautions": list(cautions(end.fixed.pair)),
    }


def _gas(answer: CaseAnswer) -> dict[str, Any]:
    end, model = answer.end, answer.prepared.gas
    return {
        "model": model.key,
        "name": model.name,
        "interactions": [
            {"a": pair.a, "b": pair.b, "k": pair.k, "source": pair.source}
            for pair in pairs_of(model, answer.prepared.candidates)
        ],
        "fluids": {name: dict(held) for name, held in end.fluids.items()},
        "left_out": dict(end.left_out),
        "taken_as_ideal": list(end.taken_as_ideal),
        "cautions": list(end.cautions),
    }


def _beside(found: CaseBeside | SettleError | None) -> dict[str, Any] | None:
    if found is None:
        return None
    if isinstance(found, SettleError):
        return _error(found)
    end = found.ideal.end
    shares = {key: found.shares(key) for key in found.main}
    return {
        **{name: getattr(end, name) for name in ("T", "p", "V", "H", "U", "S", "G")},
        "heat": found.ideal.heat,
        "phases": dict(end.phase_amounts),
        "shares": {
            key: {"real": real, "ideal": ideal, "of": of}
            for key, (real, ideal, of) in shares.items()
        },
    }


def cost_is(answer: CaseAnswer) -> str:
    """Which free energy a restriction costs: that of the state held."""
    held = PAIRS[answer.end.fixed.pair]
    return "Helmholtz energy" if held.holds_volume else "Gibbs energy"


def _reactions(answer: CaseAnswer | SettleError, view: ReactionsView) -> dict[str, Any]:
    return {
        "own": isinstance(answer, CaseAnswer) and bool(answer.prepared.reactions),
        "list": [_figures(figures) for figures in view.figures],
        "missing": view.extents.missing,
        "unexplained": {sp.key: n for sp, n in view.extents.unexplained.items()},
        "left_out": dict(view.left_out),
    }


def _figures(figures: Figures) -> dict[str, Any]:
    numbers = {
        "extent": figures.extent,
        "ln_k": figures.ln_k,
        "ln_q": figures.ln_q,
        "q_over_k": figures.q_over_k,
        "dh": figures.dh,
        "ds": figures.ds,
        "dg": figures.dg,
        "dcp": figures.dcp,
        "dh298": figures.dh298,
        "ds298": figures.ds298,
        "dg298": figures.dg298,
        "t_eq": figures.approach.T_eq,
        "approach": figures.approach.approach,
    }
    reason = (figures.approach.reason,) if figures.approach.reason else ()
    return {
        "equation": figures.reaction.text,
        "numbers": {sp.key: float(nu) for sp, nu in figures.reaction.terms},
        **{key: _finite(value) for key, value in numbers.items()},
        "notes": list(dict.fromkeys([*figures.notes, *reason])),
    }


def _finite(value: float | None) -> float | None:
    """JSON knows no infinity."""
    return value if value is not None and math.isfinite(value) else None
