"""Headless commands: ``settle`` and ``species``. Never imports Qt.

Exit code 0 when all is well, 2 for bad input, 3 where no end state exists or none could be
proven. Errors are single lines on standard error.
"""

from __future__ import annotations

import contextlib
import json
import os
import sys
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from solver.errors import InputError, SettleError

if TYPE_CHECKING:
    from solver.project.beside import CaseBeside
    from solver.project.case import CaseAnswer
    from solver.project.model import Case, Project
    from solver.reactions import ReactionsView

OK, BAD_INPUT, NO_END_STATE = 0, 2, 3

app = typer.Typer(
    name="thalweg",
    help="Where a reacting mixture ends up: chemical equilibrium with its proof.\n\n"
    "Without a command, `thalweg` or `thalweg FILE` opens the window.",
    no_args_is_help=True,
    add_completion=False,
    rich_markup_mode=None,
    context_settings={"help_option_names": ["-h", "--help"]},
)


@app.command()
def settle(
    file: Annotated[Path, typer.Argument(help="A project, NAME.thalweg.", show_default=False)],
    as_json: Annotated[
        bool, typer.Option("--json", help="Write JSON in SI units with every digit.")
    ] = False,
    with_reactions: Annotated[
        bool,
        typer.Option("--reactions", help="Add an independent reaction set, or that of the case."),
    ] = False,
    beside_ideal: Annotated[
        bool,
        typer.Option(
            "--beside-ideal", help="Set the answer of an ideal gas beside that of a real one."
        ),
    ] = False,
) -> None:
    """Settle every case of a project and print where each ends up.

    The table gives T, p, V and heat, what is present in each phase, the gas model and where it is
    poor, what did not form, what each restriction costs, and the proof. With --reactions: extents,
    ln K, Q/K, heats and temperature approaches. With --beside-ideal: T, p, V, heat and the main
    species as an ideal gas would give them, and the difference.
    Exit code 0: all settled. 2: the file or a field is wrong. 3: no such end state exists, or none
    could be proven.

    \b
    Examples:
      thalweg settle samples/reformer-outlet.thalweg
      thalweg settle samples/reformer-outlet.thalweg --reactions
      thalweg settle samples/ammonia-loop.thalweg --beside-ideal
      thalweg settle samples/lime-kiln.thalweg --json
      thalweg settle plant.thalweg --json > answer.json
    """
    from solver.project import file as project_file
    from solver.project.case import reactions_of, settle_case

    try:
        project = project_file.read(file)
    except InputError as error:
        _complain(str(error))
        raise typer.Exit(BAD_INPUT) from None
    code = OK
    results: list[tuple[Case, CaseAnswer | SettleError]] = []
    views: list[ReactionsView | None] = []
    besides: list[CaseBeside | SettleError | None] = []
    for case in project.cases:
        view = other = None
        try:
            found = settle_case(case)
        except SettleError as error:
            code = max(code, _tell(file, project, case, error), key=_rank)
            results.append((case, error))
        else:
            results.append((case, found))
            other = _beside(case, found) if beside_ideal else None
            try:
                view = reactions_of(found) if with_reactions else None
            except SettleError as error:
                code = max(code, _tell(file, project, case, error), key=_rank)
        views.append(view)
        besides.append(other)
    beside = besides if beside_ideal else None
    with _reader_may_leave():
        if as_json:
            from solver.project.answer_json import answers

            document = answers(project, results, views, beside)
            sys.stdout.write(json.dumps(document, indent=2, ensure_ascii=False) + "\n")
        else:
            from solver.project.answer_table import print_answers

            print_answers(project, results, views, beside)
    raise typer.Exit(code)


@app.command()
def species(
    text: Annotated[
        str, typer.Argument(help="A key, a formula, a name or part of one.", show_default=False)
    ],
) -> None:
    """Look a species up: its data, range, uncertainty and sources.

    \b
    Examples:
      thalweg species CO2
      thalweg species "carbon dioxide"
      thalweg species "Fe2O3(s)"
      thalweg species sulf
    """
    from solver.project.species_table import print_species
    from species_db import UnknownSpecies, load

    try:
        with _reader_may_leave():
            print_species(load(), text)
    except UnknownSpecies as error:
        from solver.project.candidates import unknown_species

        _complain(str(unknown_species(error, "text")))
        raise typer.Exit(BAD_INPUT) from None


def _beside(case: Case, found: CaseAnswer) -> CaseBeside | SettleError | None:
    """The ideal answer beside a real one, or why there is none; None where the gas is ideal."""
    from solver.project.beside import settle_beside

    if found.prepared.gas.is_ideal:
        return None
    try:
        return settle_beside(case, found)
    except SettleError as error:
        return error


def _tell(file: Path, project: Project, case: Case, error: SettleError) -> int:
    """Say what is wrong with a case, one line a fault; gives the exit code."""
    where = file.name if len(project.cases) == 1 else f"{file.name}, {case.name}"
    for fault in getattr(error, "faults", (error,)):
        place = f"{where}, {fault.field}" if fault.field else where
        _complain(f"{place}: {fault}")
    return BAD_INPUT if isinstance(error, InputError) else NO_END_STATE


def _rank(code: int) -> int:
    """Bad input outweighs a case without end state."""
    return (OK, NO_END_STATE, BAD_INPUT).index(code)


@contextlib.contextmanager
def _reader_may_leave() -> Iterator[None]:
    """Writing to a reader that stops early (head, less) is no fault."""
    try:
        yield
        sys.stdout.flush()
    except BrokenPipeError:
        # What is left in the buffer must go somewhere when Python ends.
        with contextlib.suppress(OSError):
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _complain(text: str) -> None:
    from solver.project.wording import one_line

    sys.stderr.write(one_line(f"thalweg: {text}") + "\n")


def main(argv: Sequence[str] | None = None) -> int:
    """Run one headless command.

    Parameters
    ----------
    argv
        The words after the program's name; those of the process if not given.

    Returns
    -------
    int
        The exit code.
    """
    words = list(sys.argv[1:] if argv is None else argv)
    for stream in (sys.stdout, sys.stderr):
        # A terminal without these letters shows a question mark instead of failing.
        with contextlib.suppress(AttributeError, ValueError):
            stream.reconfigure(errors="replace")  # type: ignore[union-attr]
    try:
        code = typer.main.get_command(app).main(
            args=words or ["--help"], prog_name="thalweg", standalone_mode=False
        )
    except (typer.Abort, KeyboardInterrupt):
        return 130
    except Exception as error:
        # A wrong word or option: which class says so depends on typer's version.
        if not hasattr(error, "format_message"):
            raise
        _complain(f"{error.format_message().rstrip('.')}. See thalweg --help.")
        return BAD_INPUT
    return int(code) if isinstance(code, int) else OK


if __name__ == "__main__":
    sys.exit(main())
