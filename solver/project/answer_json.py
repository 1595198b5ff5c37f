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
- ``phases``: mol of the gas and of each condensed species present;
- ``proof``: ``element_residual``, ``energy_residual``, ``gap`` (all relative), ``absent``
  (activity of each condensed candidate that did not form), ``model``;
- ``outside_range``: species present whose data do not reach the end temperature;
- ``messages``, ``cautions``: sentences.

``error`` has ``kind`` ("input", "no end state", "not proven") and ``faults``, each with
``field``, ``text``, ``value``, ``allowed``.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Final

from solver.errors import InputError, NoEndState, SettleError
from solver.project.case import CaseAnswer
from solver.project.cautions import cautions
from solver.project.model import Case, Project

VERSION: Final = 1


def answers(
    project: Project, results: Sequence[tuple[Case, CaseAnswer | SettleError]]
) -> dict[str, Any]:
    """The whole document, made of plain Python values."""
    return {
        "format": "thalweg-answer",
        "version": VERSION,
        "title": project.title,
        "cases": [
            {
                "name": case.name,
                "pair": case.fixed.pair,
                **(_error(found) if isinstance(found, SettleError) else _answer(found)),
            }
            for case, found in results
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
        "proof": {
            "element_residual": proof.element_residual,
            "energy_residual": proof.energy_residual,
            "gap": proof.gap,
            "absent": dict(proof.absent),
            "model": proof.model,
        },
        "outside_range": list(end.outside_range),
        "messages": list(answer.messages),
        "cautions": list(cautions(end.fixed.pair)),
    }
