"""Steps that bring a project file of an older version up to the present one.

One pure function per version number: step N takes the document of version N, as read from
JSON, and returns that of version N + 1. From the first release on, any change of what a file may
hold raises `VERSION`, even a new optional field, because an older program refuses what it does
not know; it then needs a step here and a file of the old version in ``tests/files/``.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any, Final

VERSION: Final = 1
"""The version this program writes."""

Document = dict[str, Any]
Step = Callable[[Document], Document]

STEPS: Final[Mapping[int, Step]] = {}


def upgrade(
    document: Document, steps: Mapping[int, Step] = STEPS, newest: int = VERSION
) -> Document:
    """Apply the steps from the document's version to `newest`; the argument is left alone."""
    version = document["version"]
    while version < newest:
        document = {**steps[version](document), "version": version + 1}
        version += 1
    return document
