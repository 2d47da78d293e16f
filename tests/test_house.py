"""The house rules that a machine can hold: layout, arrows between the packages, sizes, names."""

from __future__ import annotations

import ast
import hashlib
import re
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
PACKAGES = ("analysis", "daemon", "dashboard")
TOP_LEVEL = {"README.md", "DEVELOPERS.md", "pyproject.toml", "LICENSE", *PACKAGES, "tests"}
MADE_BY_TOOLS = re.compile(r"\..*|.*\.egg-info|build|dist|__pycache__")
MOST_LINES = 450

# What would give `analysis` files, time, threads or a database of its own.
WORLDLY = {
    "asyncio", "concurrent", "flask", "multiprocessing", "shutil", "signal", "socket", "sqlite3", "sqlite_utils",
    "subprocess", "threading", "time", "watchdog",
}  # fmt: skip
WRITING = {"write_text", "write_bytes", "mkdir", "unlink", "rename", "touch", "rmdir", "today", "utcnow"}

# Programs and makers that the project does not name; digests, so that this list does not name them either.
UNNAMED = frozenset(
    re.findall(
        r"\w+",
        """
    09b6eef35a89 0cd12e4e1f9d 169f46a63be4 2a7c3fdf03fe 3095a6f9a6c2 320d597682ed 3993424729d8
    3b631c4f1d18 3c64fe4c5a03 4165d8f2f52e 4f65bb49a057 4f6b9e1c24d9 5186015e19b5 593bfaaa4843
    5990196cc49f 6abc3aeda6b5 6f928146bac3 85f697115c7a 93378447ced0 9ac0f01ae2dd 9cd881aba255
    a7ba82826028 aa300fb004a5 aa9acb537ed8 b5a28fbec193 b93d1d4b19af beee0ad977b0 d8db1708af80
    daf79813ecfb db56b9c3e2c7 db87f26b104e e7f280ddd6a4 e9efcdc81fe3 ed260aa110cb fa116fba7680
    """,
    )
)
TEXT_FILES = {".py", ".md", ".toml", ".html", ".css", ".js", ".csv", ".edn", ".ipc", ".xml", ""}


def python_files(folder: str) -> list[Path]:
    """Every Python file below a folder of the repository."""
    return sorted(path for path in (ROOT / folder).rglob("*.py") if "__pycache__" not in path.parts)


def imported(tree: ast.AST) -> Iterator[str]:
    """The full name of everything that a module imports, wherever in it the import stands."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"relative import in line {node.lineno}"
            yield node.module or ""
            yield from (f"{node.module}.{alias.name}" for alias in node.names)


def parsed(path: Path) -> ast.Module:
    """A module's syntax tree."""
    return ast.parse(path.read_text(encoding="utf-8"), str(path))


def below(name: str, package: str) -> bool:
    """Whether a full name is the package or stands below it."""
    return name == package or name.startswith(package + ".")


MODULES = [path for package in PACKAGES for path in python_files(package)]
SOURCES = MODULES + python_files("tests")


def label(path: Path) -> str:
    """A file's name for a test's id."""
    return path.relative_to(ROOT).as_posix()


def test_top_level_holds_what_the_layout_says_and_nothing_else() -> None:
    found = {path.name for path in ROOT.iterdir() if not MADE_BY_TOOLS.fullmatch(path.name)}
    assert found == TOP_LEVEL


@pytest.mark.parametrize("path", python_files("analysis"), ids=label)
def test_analysis_knows_neither_its_users_nor_the_world(path: Path) -> None:
    tree = parsed(path)
    names = set(imported(tree))
    assert not [n for n in names if below(n, "reactance.daemon") or below(n, "reactance.dashboard")]
    assert not {n.split(".")[0] for n in names} & WORLDLY
    called = {n.func.attr for n in ast.walk(tree) if isinstance(n, ast.Call) and isinstance(n.func, ast.Attribute)}
    assert not called & WRITING


@pytest.mark.parametrize("path", python_files("dashboard"), ids=label)
def test_dashboard_reads_the_history_and_nothing_more_of_the_daemon(path: Path) -> None:
    daemon = {name for name in imported(parsed(path)) if below(name, "reactance.daemon")}
    assert not {name for name in daemon if not below(name, "reactance.daemon.history")} - {"reactance.daemon"}


@pytest.mark.parametrize("path", python_files("daemon"), ids=label)
def test_only_the_command_line_knows_the_dashboard(path: Path) -> None:
    if not path.name.startswith("cli"):
        assert not [name for name in imported(parsed(path)) if below(name, "reactance.dashboard")]


@pytest.mark.parametrize("path", SOURCES, ids=label)
def test_modules_stay_small_and_finished(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    assert sum(bool(line.strip()) for line in text.splitlines()) <= MOST_LINES
    for node in ast.walk(ast.parse(text)):
        if isinstance(node, ast.Name):
            assert node.id != "NotImplementedError", f"a stub in line {node.lineno}"
        if isinstance(node, ast.Attribute):
            assert node.attr not in {"xfail", "skipif", "importorskip"}, f"a test left out in line {node.lineno}"


def tracked_texts() -> list[Path]:
    """Every text file of the project, but none that tools made."""
    found = []
    for name in sorted(TOP_LEVEL | {".ci"}):
        place = ROOT / name
        paths = [place] if place.is_file() else place.rglob("*")
        found += [p for p in paths if p.is_file() and p.suffix in TEXT_FILES and "__pycache__" not in p.parts]
    return found


def test_no_program_or_maker_is_named() -> None:
    for path in tracked_texts():
        words = set(re.findall(r"[a-z]{3,}", path.read_text(encoding="utf-8", errors="replace").casefold()))
        named = {word for word in words if hashlib.sha256(word.encode()).hexdigest()[:12] in UNNAMED}
        assert not named, f"{label(path)} names {named}"


def test_test_files_have_unique_names() -> None:
    names = [path.name for path in python_files("tests") if path.name != "conftest.py"]
    assert len(names) == len(set(names))
