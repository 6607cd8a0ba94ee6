"""What a fresh machine relies on: the pins, the README's commands, what CI runs."""

from __future__ import annotations

import re
import subprocess
import tomllib
from pathlib import Path

from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

ROOT = Path(__file__).resolve().parents[1]
SERVE = "python3 -m venv .venv && .venv/bin/pip install -q -c constraints.txt . && .venv/bin/gainwright serve"
TEST = "python3 -m venv .venv && .venv/bin/pip install -q -c constraints.txt -e '.[test]' && .venv/bin/python -m pytest"


def pins() -> dict[str, str]:
    lines = (ROOT / "constraints.txt").read_text().splitlines()
    found = {}
    for line in lines:
        if line and not line.startswith("#"):
            assert re.fullmatch(r"[A-Za-z0-9._-]+==[A-Za-z0-9._+!-]+", line), line
            name, version = line.split("==")
            found[canonicalize_name(name)] = version
    return found


def test_everything_needed_is_pinned_within_its_range() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]
    extras = project["optional-dependencies"]
    pinned = pins()
    for text in [*project["dependencies"], *extras["test"], *extras["postgres"]]:
        needed = Requirement(text)
        version = pinned.get(canonicalize_name(needed.name))
        assert version is not None, f"{needed.name} has no pin in constraints.txt"
        assert needed.specifier.contains(version), f"{needed} does not take {version}"


def test_the_readme_gives_the_two_commands() -> None:
    readme = (ROOT / "README.md").read_text().splitlines()
    assert SERVE in readme
    assert TEST in readme
    assert readme.index(SERVE) < readme.index(TEST)


def test_ci_runs_what_a_developer_runs() -> None:
    script = (ROOT / ".ci" / "run").read_text()
    assert TEST in script.splitlines()
    assert subprocess.run(["bash", "-n", str(ROOT / ".ci" / "run")], timeout=10).returncode == 0
