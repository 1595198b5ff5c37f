"""Errors of the species library."""


class UnknownSpecies(KeyError):
    """No record answers to a text; `near` holds the keys that come closest."""

    def __init__(self, text: str, near: tuple[str, ...] = (), reason: str = "") -> None:
        super().__init__(text, near, reason)
        self.text = text
        self.near = near
        self.reason = reason

    def __str__(self) -> str:
        said = self.reason or f"no species answers to {self.text!r}"
        return f"{said}; near: {', '.join(self.near)}" if self.near else said
