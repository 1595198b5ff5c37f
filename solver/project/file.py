"""Reading and writing project files: ``NAME.thalweg``, UTF-8 JSON.

A file that cannot be read in full (damaged, of a newer version, of another kind) is refused
with the place of the fault, and is never written over. Saving writes a new file beside the old
one, flushes it to the disk and renames it, so that a crash leaves one or the other whole.
"""

from __future__ import annotations

import contextlib
import json
import os
import stat
import tempfile
from collections.abc import Iterable
from pathlib import Path
from typing import Any, Final

from pydantic import ValidationError

from solver.errors import InputError
from solver.project.model import Project
from solver.project.upgrades import VERSION, Document, upgrade

FORMAT: Final = "thalweg-project"
SUFFIX: Final = ".thalweg"
LARGEST: Final = 64_000_000
"""Bytes; no project comes near, but a device or a film picked by mistake goes beyond."""


class ProjectFileError(InputError):
    """A file that cannot be opened or written.

    `field` is the place of the fault: "line 3, column 7" in the text, or a path such as
    ``cases[0].streams[1].T.unit`` in the project.
    """


def read(path: str | os.PathLike[str]) -> Project:
    """Open a project file of this or an older version.

    Raises
    ------
    ProjectFileError
        With one line that names file, place and fault. The file is left as it is.
    """
    where = Path(path)
    try:
        with where.open("rb") as file:
            data = file.read(LARGEST + 1)
    except OSError as error:
        raise ProjectFileError(f"{where}: {_system(error)}", value=str(where)) from None
    if len(data) > LARGEST:
        raise ProjectFileError(f"{where}: the file is too large for a project.", value=str(where))
    return parse(data, where.name)


def parse(data: bytes, name: str = "project") -> Project:
    """The project that the bytes of a file hold; `name` is used in error texts only."""
    document = upgrade(_envelope(_json(data, name), name))
    content = {k: v for k, v in document.items() if k not in ("format", "version")}
    try:
        return Project.model_validate(content)
    except ValidationError as error:
        raise _invalid(error, name) from None


def text_of(project: Project) -> str:
    """The text of a project file; reading it back gives an equal project."""
    content = project.model_dump(mode="json", exclude_none=True)
    document = {"format": FORMAT, "version": VERSION, **_tidy(content)}
    text = json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False) + "\n"
    # Half a character (a broken paste) cannot be written; it must not cost the rest.
    return text.encode("utf-8", "replace").decode("utf-8")


def write(project: Project, path: str | os.PathLike[str]) -> None:
    """Save a project; the file at `path` is either the old or the new one, never half of each.

    Raises
    ------
    ProjectFileError
        When the place cannot be written, or holds a file that this program cannot read: that
        one stays, and another name is needed.
    """
    # A link stays a link: the file it points to is the one replaced.
    where = Path(os.path.realpath(path))
    mode = _guard(where)
    data = text_of(project).encode("utf-8")
    temporary = ""
    try:
        handle, temporary = tempfile.mkstemp(
            prefix=f".{where.name[:100]}.", suffix=".part", dir=where.parent
        )
        with os.fdopen(handle, "wb") as file:
            file.write(data)
            file.flush()
            os.fsync(file.fileno())
        os.chmod(temporary, mode)
        os.replace(temporary, where)
    except OSError as error:
        if temporary:
            with contextlib.suppress(OSError):
                os.unlink(temporary)
        raise ProjectFileError(f"{path}: {_system(error)}", value=str(path)) from None
    _flush_folder(where.parent)


def _guard(where: Path) -> int:
    """Refuse to write over what cannot be read; give the permissions the new file should have."""
    try:
        found = where.stat()
    except FileNotFoundError:
        mask = os.umask(0)
        os.umask(mask)
        return 0o666 & ~mask
    except OSError as error:
        raise ProjectFileError(f"{where}: {_system(error)}", value=str(where)) from None
    if found.st_size or not stat.S_ISREG(found.st_mode):
        try:
            read(where)
        except ProjectFileError as error:
            raise ProjectFileError(
                f"{error} It is left as it is; save under another name.",
                error.field,
                error.value,
                error.allowed,
            ) from None
    return stat.S_IMODE(found.st_mode)


def _flush_folder(folder: Path) -> None:
    """Make the renaming itself last through a power cut, where the system offers it."""
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _json(data: bytes, name: str) -> Any:
    if not data.strip():
        raise ProjectFileError(f"{name}: the file is empty; it holds no project.", "line 1")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        place = _place(data[: error.start].decode("utf-8", "replace"))
        raise ProjectFileError(
            f"{name}, {place}: this is no text in UTF-8; it is no Thalweg project.", place
        ) from None

    def refuse_repeats(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
        seen = dict(pairs)
        if len(seen) < len(pairs):
            twice = next(k for i, (k, _) in enumerate(pairs) if k in (p[0] for p in pairs[:i]))
            raise ProjectFileError(f"{name}: the field {twice!r} is given twice.", twice)
        return seen

    def refuse_constant(constant: str) -> Any:
        raise ProjectFileError(f"{name}: {constant} is no number.", value=constant)

    try:
        return json.loads(text, object_pairs_hook=refuse_repeats, parse_constant=refuse_constant)
    except json.JSONDecodeError as error:
        place = f"line {error.lineno}, column {error.colno}"
        at_end = error.pos >= len(text.rstrip()) or error.msg.startswith("Unterminated")
        fault = "the file breaks off" if at_end else f"{error.msg.lower()}"
        raise ProjectFileError(f"{name}, {place}: {fault}; the file is damaged.", place) from None
    except (RecursionError, ValueError):
        # Nested without end, or a whole number of thousands of digits.
        raise ProjectFileError(f"{name}: this is no Thalweg project.", "line 1") from None


def _place(before: str) -> str:
    lines = before.split("\n")
    return f"line {len(lines)}, column {len(lines[-1]) + 1}"


def _envelope(document: Any, name: str) -> Document:
    """Check format and version before looking at anything else."""
    if not isinstance(document, dict) or document.get("format") != FORMAT:
        raise ProjectFileError(
            f'{name}: this is no Thalweg project ("format": "{FORMAT}" is missing).',
            "format",
            document.get("format") if isinstance(document, dict) else None,
            FORMAT,
        )
    version = document.get("version")
    allowed = f"1 to {VERSION}" if VERSION > 1 else "1"
    if isinstance(version, bool) or not isinstance(version, int) or version < 1:
        raise ProjectFileError(
            f"{name}, version: {version!r} is no version of the project format (known: {allowed}).",
            "version",
            version,
            allowed,
        )
    if version > VERSION:
        raise ProjectFileError(
            f"{name}, version: this project was written by a newer Thalweg "
            f"(format version {version}, this program reads {allowed}); "
            "open it with that one.",
            "version",
            version,
            allowed,
        )
    return document


def path_text(parts: Iterable[int | str]) -> str:
    """A path as shown: cases[0].streams[1].T.unit."""
    text = ""
    for part in parts:
        text += f"[{part}]" if isinstance(part, int) else f".{part}" if text else part
    return text


_FAULTS: Final = {
    "missing": "is missing",
    "extra_forbidden": "is not a field known here",
    "finite_number": "is not a finite number",
    "string_type": "must be a text",
    "bool_type": "must be true or false",
    "tuple_type": "must be a list",
    "dict_type": "must be a group of fields",
    "model_type": "must be a group of fields",
    "model_attributes_type": "must be a group of fields",
    "too_short": "must not be empty",
    "union_tag_not_found": "does not say its kind (inert, conversion, approach or no exchange)",
}


def _invalid(error: ValidationError, name: str) -> ProjectFileError:
    """One line for the first fault of a document, with its path."""
    every = error.errors(include_url=False, include_context=True)
    # A list whose only member is wrong is reported as too short besides.
    faults = [f for f in every if f["type"] != "too_short"] or every
    first = faults[0]
    loc = _place_in(first["loc"])
    fault = _FAULTS.get(first["type"], "is not allowed")
    if loc and loc[-1] in ("float", "str"):  # the two faces of a number field
        loc = loc[:-1]
        fault = "must be a number" if first["type"] == "float_type" else fault
    if loc and loc[-1] == "[key]":
        loc, fault = loc[:-1], "is not a state variable (T, p, V, H, U or S)"
    allowed = str(first.get("ctx", {}).get("expected", ""))
    if first["type"] == "literal_error":
        fault = f"must be {allowed}, not {first['input']!r}"
    if first["type"] == "union_tag_invalid":
        allowed = str(first["ctx"]["expected_tags"])
        loc, fault = (*loc, "kind"), f"must be one of {allowed}, not {first['ctx']['tag']!r}"
    places = {f["loc"][:-1] if f["loc"][-1] in ("float", "str") else f["loc"] for f in faults}
    others = len(places) - 1
    more = f" (and {others} more fault{'s' if others > 1 else ''})" if others else ""
    path = path_text(loc) or "the project"
    return ProjectFileError(f"{name}, {path}: {fault}{more}.", path, first["input"], allowed)


def _place_in(loc: tuple[int | str, ...]) -> tuple[int | str, ...]:
    """The place without the kind of a restriction, which the checker puts into the path."""
    if "restrictions" not in loc:
        return loc
    at = loc.index("restrictions") + 2
    return (*loc[:at], *loc[at + 1 :])


def _system(error: OSError) -> str:
    """What the operating system said, in a sentence."""
    known = {
        FileNotFoundError: "there is no such file.",
        IsADirectoryError: "this is a folder, not a project file.",
        NotADirectoryError: "part of the path is no folder.",
        PermissionError: "access is not allowed.",
    }
    for kind, text in known.items():
        if isinstance(error, kind):
            return text
    return f"{(error.strerror or 'the system refused').lower()}."


def _tidy(value: Any) -> Any:
    """Whole numbers without a trailing .0, so that a file reads as it was typed."""
    if isinstance(value, float) and value.is_integer() and abs(value) < 1e15:
        return int(value)
    if isinstance(value, dict):
        return {k: _tidy(v) for k, v in value.items()}
    if isinstance(value, list):
        return [_tidy(v) for v in value]
    return value
