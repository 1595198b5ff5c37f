"""Where a reacting mixture ends up: the minimiser, its proof and what is built upon them."""

from solver.beside import Beside, beside_ideal
from solver.endstate import EndState
from solver.endstates import EndStates
from solver.errors import InputError, NoEndState, NotProven, SettleError
from solver.fed import Fed, as_fed
from solver.fixed import PAIRS, Fixed
from solver.gas_model import GAS_MODELS, GasModel
from solver.proof import Proof
from solver.restrictions import FixedConversion, HeldApproach, Inert, NoExchange
from solver.settle import settle
from solver.settle_many import settle_many

__all__ = [
    "GAS_MODELS",
    "PAIRS",
    "Beside",
    "EndState",
    "EndStates",
    "Fed",
    "Fixed",
    "FixedConversion",
    "GasModel",
    "HeldApproach",
    "Inert",
    "InputError",
    "NoEndState",
    "NoExchange",
    "NotProven",
    "Proof",
    "SettleError",
    "as_fed",
    "beside_ideal",
    "settle",
    "settle_many",
]
