"""How the house is built: who may import whom, how large a module may be, what a file may say."""

from __future__ import annotations

import ast
import re
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]
PACKAGES = ("gui", "solver", "species_db")
MODULES = sorted(path for package in PACKAGES for path in (ROOT / package).rglob("*.py"))
MOST_LINES = 600

TOP_LEVEL = {
    ".ci",
    ".gitignore",
    "CHANGELOG.md",
    "DEVELOPERS.md",
    "LICENSE",
    "Makefile",
    "NOTICE",
    "README.md",
    "gui",
    "locks",
    "pyproject.toml",
    "samples",
    "solver",
    "species_db",
    "tests",
}


def tracked() -> list[Path]:
    """The files under version control, or all files of the packages where there is no git."""
    try:
        listed = subprocess.run(
            ["git", "ls-files", "-z"], cwd=ROOT, capture_output=True, check=True
        ).stdout
    except (OSError, subprocess.CalledProcessError):
        pytest.skip("no git here")
    paths = [ROOT / name.decode() for name in listed.split(b"\0") if name]
    return [path for path in paths if path.is_file()]


def python(code: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, timeout=100
    )


def relative(path: Path) -> str:
    return str(path.relative_to(ROOT))


def test_imports_point_one_way():
    """gui -> solver -> species_db, and no Qt below gui: the contracts in pyproject.toml."""
    lint = subprocess.run(
        [str(Path(sys.executable).with_name("lint-imports")), "--no-cache"],
        cwd=ROOT,
        capture_output=True,
        text=True,
    )
    assert lint.returncode == 0, lint.stdout


NO_QT = """
import importlib.abc, importlib, pkgutil, sys
class NoQt(importlib.abc.MetaPathFinder):
    def find_spec(self, name, path=None, target=None):
        if name.partition(".")[0] in {"PySide6", "shiboken6", "pyqtgraph", "gui"}:
            raise ImportError(f"{name} must not be needed here")
sys.meta_path.insert(0, NoQt())
seen = 0
for package in ("species_db", "solver"):
    root = importlib.import_module(package)
    for found in pkgutil.walk_packages(root.__path__, package + "."):
        if found.name.startswith("species_db.build") or found.name.endswith("__main__"):
            continue
        importlib.import_module(found.name)
        seen += 1
print(seen)
"""


def test_solver_and_species_db_do_without_qt():
    done = python(NO_QT)
    assert done.returncode == 0, done.stderr
    assert int(done.stdout) >= 5


@pytest.mark.parametrize(
    ("package", "kept_out"),
    [
        ("species_db", {"scipy", "pandas", "pint", "pydantic", "typer", "rich", "PySide6"}),
        ("solver", {"pandas", "pint", "pydantic", "typer", "rich", "PySide6", "pyqtgraph"}),
        ("gui", {"PySide6", "pyqtgraph", "pandas", "pint", "numpy"}),
    ],
)
def test_import_is_light(package: str, kept_out: set[str]):
    """What start-up does not need is not imported: a package loads the rest when asked to."""
    done = python(f"import sys, {package}; print(' '.join(sys.modules))")
    assert done.returncode == 0, done.stderr
    assert not kept_out & set(done.stdout.split())


def module_name(path: Path) -> str:
    name = ".".join(path.relative_to(ROOT).with_suffix("").parts)
    return name.removesuffix(".__init__")


def imported_at_load(path: Path, names: set[str]) -> set[str]:
    """Our modules that a module imports when it is loaded (not those inside functions)."""
    found: set[str] = set()
    pending: list[ast.stmt] = list(ast.parse(path.read_text("utf-8")).body)
    package = module_name(path) if path.name == "__init__.py" else module_name(path.parent / "x")
    package = package.removesuffix(".x")
    while pending:
        node = pending.pop()
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            base = node.module or ""
            if node.level:
                above = package.split(".")[: len(package.split(".")) - node.level + 1]
                base = ".".join([*above, *([node.module] if node.module else [])])
            for alias in node.names:
                inner = f"{base}.{alias.name}"
                found.add(inner if inner in names else base)
        elif isinstance(node, ast.If):
            if "TYPE_CHECKING" not in ast.dump(node.test):
                pending += node.body
            pending += node.orelse
        elif isinstance(node, ast.Try):
            pending += node.body + [line for part in node.handlers for line in part.body]
    return found & names


def test_no_module_imports_itself_in_a_circle():
    names = {module_name(path) for path in MODULES}
    graph = {module_name(path): imported_at_load(path, names) for path in MODULES}
    done: set[str] = set()

    def walk(name: str, trail: tuple[str, ...]) -> None:
        assert name not in trail, "imports in a circle: " + " -> ".join([*trail, name])
        if name not in done:
            for other in graph[name] - {name}:
                walk(other, (*trail, name))
            done.add(name)

    for name in graph:
        walk(name, ())
    assert done == names


def test_modules_are_small():
    sizes = {relative(path): len(path.read_text("utf-8").splitlines()) for path in MODULES}
    assert not {name: size for name, size in sizes.items() if size > MOST_LINES}


def test_modules_say_what_they_own():
    """Every module but an empty one opens with a docstring."""
    silent = [
        relative(path)
        for path in MODULES
        if (tree := ast.parse(path.read_text("utf-8"))).body and not ast.get_docstring(tree)
    ]
    assert not silent


def test_packages_are_typed():
    for package in PACKAGES:
        assert (ROOT / package / "py.typed").is_file()


def test_top_level_is_tidy():
    assert {path.relative_to(ROOT).parts[0] for path in tracked()} <= TOP_LEVEL


# Addresses of package registries: a lock or a script must work with whatever index a machine has.
# Split, so that this file does not hold what it forbids.
REGISTRIES = (
    "pypi" + ".org",
    "python" + "hosted",
    "npm" + "js",
    "deb.deb" + "ian",
    "/opt/" + "pypi",
)
UNWANTED = (
    r"\bthe " + r"lecture\b",
    r"\blecture " + r"notes?\b",
    r"--extra-index" + r"-url",
    r"/work/" + r"(shared|main)",
    r"\btorch" + r"==",
)


def test_no_file_names_a_registry_or_this_machine():
    faults = []
    forbidden = re.compile("|".join([*map(re.escape, REGISTRIES), *UNWANTED]), re.IGNORECASE)
    for path in tracked():
        if path.suffix in {".png", ".gz", ".npz", ".pdf", ".ico"}:
            continue
        for number, line in enumerate(path.read_text("utf-8").splitlines(), start=1):
            if found := forbidden.search(line):
                faults.append(f"{relative(path)}:{number}: {found.group()}")
    assert not faults


@pytest.mark.parametrize("name", ["run", "check", "data"])
def test_locks_hold_hashes(name: str):
    """Each requirement is pinned to one version and carries the hashes of its files."""
    text = (ROOT / "locks" / f"{name}.txt").read_text()
    entries = [entry for entry in re.split(r"\n(?=[a-z])", text) if entry.strip()]
    assert len(entries) >= 10
    for entry in entries:
        assert re.match(r"[a-z0-9._-]+==\S+", entry)
        assert "--hash=sha256:" in entry


def test_locks_cover_what_the_project_asks_for():
    project = tomllib.loads((ROOT / "pyproject.toml").read_text())

    def wanted(requirements: list[str]) -> set[str]:
        names = (re.match(r"[\w.-]+", text) for text in requirements)
        return {re.sub(r"[-_.]+", "-", name.group()).lower() for name in names if name}

    def locked(name: str) -> set[str]:
        text = (ROOT / "locks" / f"{name}.txt").read_text()
        return set(re.findall(r"^([a-z0-9.-]+)==", text, re.MULTILINE))

    groups = project["dependency-groups"]
    run = wanted(project["project"]["dependencies"]) | wanted(groups["build"])
    assert run <= locked("run") <= locked("check")
    assert wanted(groups["check"]) <= locked("check")
    assert wanted(groups["data"]) <= locked("data")
    assert not {"torch", "pyside6", "pyside6-addons"} & locked("check")


def test_make_explains_itself():
    """Each target the README or DEVELOPERS.md names exists, and `make help` lists it."""
    listed = subprocess.run(["make", "help"], cwd=ROOT, capture_output=True, text=True).stdout
    text = (ROOT / "README.md").read_text() + (ROOT / "DEVELOPERS.md").read_text()
    named = set(re.findall(r"(?:`|^)make ([a-z]+)\b", text, re.MULTILINE))
    assert {"run", "test"} <= named
    assert named <= set(re.findall(r"^  make (\w+)", listed, re.MULTILINE))


REFERENCES = """
import sys
from PySide6.QtCore import QCoreApplication, QObject, Signal
class Source(QObject):
    signal = Signal()
app, source = QCoreApplication([]), Source()
source.signal.connect(lambda: None)
before = sys.getrefcount(None), sys.getrefcount(True)
for _ in range(200):
    app.processEvents()
    source.signal.emit()
after = sys.getrefcount(None), sys.getrefcount(True)
print(max(abs(a - b) for a, b in zip(after, before, strict=True)))
"""


def test_qt_binding_keeps_count_of_references():
    """A binding that loses references to None aborts the window after some minutes of use."""
    done = python(REFERENCES)
    assert done.returncode == 0, done.stderr
    assert int(done.stdout) < 20
