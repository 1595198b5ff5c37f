"""Reactions: what a change of amounts means in chemical equations, and how to check it by hand."""

from solver.reactions.approach import Approach, equilibrium_temperature
from solver.reactions.extents import Extents, extents_of
from solver.reactions.figures import Figures, ReactionsView, reaction_figures, reactions_at
from solver.reactions.hand import HandCalculation, hand_calculation
from solver.reactions.independence import check_independent, parse_set, reaction_count
from solver.reactions.reaction import Reaction

__all__ = [
    "Approach",
    "Extents",
    "Figures",
    "HandCalculation",
    "Reaction",
    "ReactionsView",
    "check_independent",
    "equilibrium_temperature",
    "extents_of",
    "hand_calculation",
    "parse_set",
    "reaction_count",
    "reaction_figures",
    "reactions_at",
]
