"""The sources of the table, by the id that each record carries."""

import functools
import tomllib
from pathlib import Path
from typing import Any


@functools.cache
def sources() -> dict[str, dict[str, Any]]:
    """Title, authors, year and use of each source, by id (``data/sources.toml``)."""
    text = Path(__file__).with_name("data").joinpath("sources.toml").read_text("utf-8")
    return {key: value for key, value in tomllib.loads(text).items() if isinstance(value, dict)}
