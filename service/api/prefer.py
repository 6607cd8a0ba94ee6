"""Prefer: how long a client is willing to wait for a result (RFC 7240)."""

from __future__ import annotations

import re
from collections.abc import Sequence

LONGEST_S = 120

WAIT = re.compile(r"wait\s*=\s*(?:\"(\d{1,9})\"|(\d{1,9}))\s*(?:;.*)?", re.IGNORECASE)


def wait_seconds(prefer: Sequence[str]) -> int | None:
    """The first `wait` among the Prefer headers, at most LONGEST_S; None where there is none that can be read.

    RFC 7240, 2: of a preference that comes twice the first counts; one that is not understood is ignored.
    """
    for one in ",".join(prefer).split(","):
        found = WAIT.fullmatch(one.strip())
        if found:
            return min(int(found[1] or found[2]), LONGEST_S)
    return None
