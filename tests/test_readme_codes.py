"""The README's table of read errors and findings is complete: every code that the record's room can give, no other.

Expected in README.md: one table between the lines `<!-- read codes -->` and `<!-- /read codes -->`, with rows

    | `code` | error or finding | meaning | what to do |
"""

from __future__ import annotations

import ast
import re
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]
MAKERS = {"ReadError": "error", "IdentError": "error", "Finding": "finding", "_said": "finding"}


def given() -> dict[str, set[str]]:
    """{code: kinds} of the errors and findings made in ident/record, read from its source."""
    found: dict[str, set[str]] = {}
    for file in sorted((ROOT / "ident" / "record").glob("*.py")):
        for node in ast.walk(ast.parse(file.read_text())):
            if not (isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id in MAKERS):
                continue
            kind = MAKERS[node.func.id]
            # A code is a literal, or (where two are chosen between) a name that is assigned literals.
            code = node.args[0]
            if isinstance(code, ast.Constant):
                found.setdefault(str(code.value), set()).add(kind)
            else:
                assert (file.name, ast.unparse(code)) in CHOSEN, f"{file.name}:{node.lineno}: which code is this?"
                for each in CHOSEN[file.name, ast.unparse(code)]:
                    found.setdefault(each, set()).add(kind)
    return found


CHOSEN = {("stamps.py", "code"): ("not-finite", "unreadable-time"), ("clock.py", "code"): ()}


def table() -> dict[str, tuple[str, str, str]]:
    readme = (ROOT / "README.md").read_text()
    part = re.search(r"<!-- read codes -->\n(.*?)<!-- /read codes -->", readme, re.DOTALL)
    assert part, "README.md needs its table of codes between <!-- read codes --> and <!-- /read codes -->"
    rows = [[cell.strip() for cell in line.strip("| ").split(" | ")] for line in part[1].splitlines() if "`" in line]
    assert all(len(row) == 4 for row in rows), [row for row in rows if len(row) != 4]
    codes = [row[0].strip("`") for row in rows]
    assert len(codes) == len(set(codes)), "a code stands twice"
    return {code: (row[1], row[2], row[3]) for code, row in zip(codes, rows, strict=True)}


def test_every_code_is_in_the_table_and_every_row_is_a_code() -> None:
    assert sorted(table()) == sorted(given())


def test_every_row_says_which_kind_what_it_means_and_what_to_do() -> None:
    for code, (kind, meaning, advice) in table().items():
        assert set(re.findall(r"error|finding", kind)) == given()[code], code
        assert len(meaning.split()) >= 3, code
        assert len(advice.split()) >= 2, code


@pytest.mark.parametrize("code", sorted(given()))
def test_codes_are_lower_case_with_hyphens(code: str) -> None:
    assert re.fullmatch(r"[a-z0-9]+(-[a-z0-9]+)*", code)
