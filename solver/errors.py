"""The one family of errors the solver raises: what is wrong, where, and what to change."""

from __future__ import annotations


class SettleError(Exception):
    """Something the engineer can act upon.

    Attributes
    ----------
    field : str
        The faulty input, e.g. ``"feed[CH4]"`` or ``"fixed.T"``.
    value : object
        What was given.
    allowed : str
        What would have been accepted.
    """

    def __init__(self, text: str, field: str = "", value: object = None, allowed: str = "") -> None:
        super().__init__(text)
        self.field = field
        self.value = value
        self.allowed = allowed

    def __reduce__(self) -> tuple[type, tuple[object, ...]]:
        return type(self), (str(self), self.field, self.value, self.allowed)


class InputError(SettleError):
    """The problem as posed makes no sense: a field must be changed."""


class NoEndState(SettleError):
    """The problem is well posed but no state satisfies it."""


class NotProven(SettleError):
    """An end state was computed but its proof is not within tolerance, so it is withheld."""
