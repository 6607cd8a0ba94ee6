"""The house holds: who may import whom, how long a file may be, and no room for odds and ends.

The floors are those of the architecture; imports are read from the source, so nothing has to run.
"""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

import ident

ROOT = Path(__file__).resolve().parents[1]

# Lowest first; a room imports from floors below its own, never from its neighbours on the same floor.
IDENT = (
    {"errors"},
    {"findings"},
    {"record", "plants"},
    {"loop"},
    {"evidence"},
    {"estimate"},
    {"judge"},
    {"tune"},
    {"realise", "watch"},
    {"report"},
)
SERVICE = (
    {"errors", "settings", "version"},
    {"store"},
    {"work"},
    {"api"},
    {"app"},
    {"serve"},
    {"cli"},
)
# Evidence is arrays in, numbers out; whoever tunes or realises works on loops, whoever watches on estimates.
CLOSED_TO = {"evidence": {"record", "plants", "loop"}, "realise": {"estimate", "judge", "tune"}}
# Numerics know no web, no database, no log file; only one room may reach for the cross-check.
IDENT_FOREIGN = {
    "fastapi", "starlette", "uvicorn", "pydantic", "pydantic_settings", "sqlalchemy", "alembic", "sqlite3",
    "psycopg", "logging", "matplotlib", "control", "http", "urllib", "socket", "asyncio", "service",
}  # fmt: skip
SQL = {"sqlalchemy", "alembic", "sqlite3", "psycopg"}
HTTP = {"fastapi", "starlette", "uvicorn", "http", "urllib", "httpx2"}

LONGEST = 350


def sources(package: str) -> list[Path]:
    return sorted((ROOT / package).rglob("*.py"))


def room(file: Path) -> str:
    """The room of a file: its folder below the package, or its own name."""
    parts = file.relative_to(ROOT).with_suffix("").parts
    return parts[1]


def imports(file: Path) -> Iterator[tuple[str, tuple[str, ...]]]:
    """(module, names taken from it) of every import in a file, wherever it stands."""
    for node in ast.walk(ast.parse(file.read_text())):
        if isinstance(node, ast.Import):
            for alias in node.names:
                yield alias.name, ()
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{file}: relative imports hide which floor they reach"
            yield node.module or "", tuple(alias.name for alias in node.names)


def reached(file: Path, package: str) -> set[str]:
    """Rooms of `package` that a file imports from."""
    found = set()
    for module, names in imports(file):
        head, *rest = module.split(".")
        if head == package:
            found |= {rest[0]} if rest else set(names)
    return found


def floor(room: str, floors: tuple[set[str], ...]) -> int:
    (level,) = [i for i, rooms in enumerate(floors) if room in rooms]
    return level


@pytest.mark.parametrize(("package", "floors"), [("ident", IDENT), ("service", SERVICE)])
def test_nobody_imports_from_a_higher_floor(package: str, floors: tuple[set[str], ...]) -> None:
    wrong = [
        f"{file.relative_to(ROOT)} imports {package}.{there}"
        for file in sources(package)
        if (here := room(file)) != "__init__"
        for there in reached(file, package) - {here}
        if floor(there, floors) >= floor(here, floors) or there in CLOSED_TO.get(here, ())
    ]
    assert wrong == []


def test_every_room_has_a_floor() -> None:
    for package, floors in (("ident", IDENT), ("service", SERVICE)):
        rooms = {room(file) for file in sources(package)} - {"__init__"}
        assert rooms <= set().union(*floors)


def test_service_takes_from_ident_only_what_it_exports() -> None:
    exported = set(ident.__all__)
    wrong = []
    for file in sources("service"):
        taken = {name for module, names in imports(file) if module == "ident" for name in names}
        deep = {module for module, _ in imports(file) if module.startswith("ident.")}
        used = {
            node.attr
            for node in ast.walk(ast.parse(file.read_text()))
            if isinstance(node, ast.Attribute) and isinstance(node.value, ast.Name) and node.value.id == "ident"
        }
        wrong += [f"{file.relative_to(ROOT)}: {name}" for name in sorted(deep | ((taken | used) - exported))]
    assert wrong == []


@pytest.mark.parametrize(
    ("where", "foreign"),
    [
        ("ident", IDENT_FOREIGN),
        ("service/api", SQL),
        ("service/page", SQL | HTTP),
        ("service/work", HTTP | {"service.api"}),
        ("service/store", HTTP | {"service.api"}),
    ],
)
def test_a_room_does_not_know_what_is_not_its_business(where: str, foreign: set[str]) -> None:
    wrong = [
        f"{file.relative_to(ROOT)} imports {module}"
        for file in sources(where)
        for module, _ in imports(file)
        if module.split(".")[0] in foreign or any(module.startswith(f) for f in foreign if "." in f)
    ]
    assert wrong == []


def test_only_judge_knows_the_cross_check() -> None:
    users = {
        str(file.relative_to(ROOT).parent)
        for package in ("ident", "service")
        for file in sources(package)
        for module, _ in imports(file)
        if module.split(".")[0] == "sippy_unipi"
    }
    assert users <= {"ident/judge"}


def test_files_are_short_and_none_is_a_drawer() -> None:
    for package in ("ident", "service"):
        for file in sources(package):
            assert file.stem not in {"utils", "util", "helpers", "misc", "common"}, file
            lines = len(file.read_text().splitlines())
            assert lines <= LONGEST, f"{file.relative_to(ROOT)} has {lines} lines"
