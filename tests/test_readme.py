"""The README tells the truth: its Python runs, its commands work, its files exist."""

from __future__ import annotations

import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]
README = (ROOT / "README.md").read_text("utf-8")


def blocks(language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```", README, re.MULTILINE | re.DOTALL)


COMMANDS = [
    shlex.split(line, comments=True)
    for block in blocks("sh")
    for line in block.splitlines()
    if line.startswith(".venv/bin/thalweg")
]


def test_python_example_runs_as_printed():
    code = "\n".join(blocks("python"))
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", code],
        cwd=ROOT,
        capture_output=True,
        text=True,
        timeout=100,
    )
    assert done.returncode == 0, done.stderr
    assert "hydrogen" in done.stdout
    assert re.search(r"^\d{4} K and \d\.\d\d bar$", done.stdout, re.MULTILINE)


@pytest.mark.parametrize("command", COMMANDS, ids=" ".join)
def test_command_works(command: list[str]):
    _, *arguments = command
    if arguments[0].endswith(".thalweg"):  # opens the window: tests/gui does that
        assert (ROOT / arguments[0]).is_file()
        return
    program = Path(sys.executable).with_name("thalweg")
    done = subprocess.run(
        [str(program), *arguments], cwd=ROOT, capture_output=True, text=True, timeout=100
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.strip()


def test_readme_has_commands():
    assert len(COMMANDS) >= 3


@pytest.mark.parametrize("name", sorted(set(re.findall(r"\]\((?!http)([^)#]+)\)", README))))
def test_linked_file_exists(name: str):
    assert (ROOT / name).is_file()
