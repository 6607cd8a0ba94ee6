"""Paging: one page of a list, and where the next one is (RFC 8288, rel="next")."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Annotated, Any, TypeVar
from urllib.parse import quote

from fastapi import Query, Response
from starlette.requests import Request

T = TypeVar("T")

Limit = Annotated[int, Query(ge=1, le=1000, description="Longest page.")]
After = Annotated[
    str | None, Query(min_length=1, max_length=100, description="Where the last page ended; from its Link header.")
]

LINK: dict[str, Any] = {
    "Link": {
        "description": 'The next page, rel="next" (RFC 8288); none on the last one.',
        "schema": {"type": "string"},
    }
}


def page(request: Request, response: Response, found: Sequence[T], limit: int, key: Callable[[T], str]) -> Sequence[T]:
    """The first `limit` of what was found when one more was looked for; `key` names an item for `after`."""
    if len(found) <= limit:
        return found
    shown = found[:limit]
    # The address as it was sent, whose escapes the decoded path has lost.
    path = request.scope.get("raw_path") or quote(request.url.path).encode()
    after = quote(key(shown[-1]), safe="")
    response.headers["Link"] = f'<{path.decode("ascii", "replace")}?limit={limit}&after={after}>; rel="next"'
    return shown
