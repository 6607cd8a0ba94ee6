"""Names of loops in addresses."""

from __future__ import annotations

import unicodedata
from typing import Annotated
from urllib.parse import quote

from fastapi import Depends, Path

from service.errors import ProblemError

LONGEST = 100


def loop_name(
    loop: Annotated[
        str,
        Path(
            min_length=1,
            max_length=LONGEST,
            description="Name of the loop: letters of any script, digits, spaces, signs but no slash, percent-encoded.",
        ),
    ],
) -> str:
    """The name, in Unicode's composed form, for two spellings that look alike are one loop.

    Raises ProblemError: invalid-loop-name.
    """
    name = unicodedata.normalize("NFC", loop)
    usable = name.isprintable() and name == name.strip() and not set(name) & set("/\\\ufffd")
    if not usable or name in (".", "..") or len(name) > LONGEST:
        raise ProblemError(
            "invalid-loop-name",
            f"A loop's name has 1 to {LONGEST} printable characters, no slash or backslash, no space at either end, "
            "and is in UTF-8 before it is percent-encoded. Choose another name.",
        )
    return name


LoopName = Annotated[str, Depends(loop_name)]


def address(loop: str) -> str:
    """Where a loop is found."""
    return f"/v1/loops/{quote(loop, safe='')}"
