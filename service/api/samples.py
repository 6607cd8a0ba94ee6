"""Sample logs that come with the service, so that it can be tried before a log of one's own is at hand."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Annotated

from fastapi import APIRouter, Response
from fastapi import Path as InPath
from starlette.responses import FileResponse

from service.api.problems import documented
from service.errors import ProblemError

router = APIRouter(prefix="/v1/samples", tags=["samples"])

FOLDER = Path(__file__).resolve().parents[1] / "page" / "samples"

# {name: (title, description)}
ABOUT = {
    "step_test.csv": (
        "Step test of an almond pan",
        "Manual operation: the drum's motor answers nine moves of the command, up and down; rpm and %.",
    ),
}


@dataclass(frozen=True, slots=True)
class Sample:
    """One sample log: what it is called, what is in it, how large it is, where it is."""

    name: str
    title: str
    description: str
    size_bytes: int
    href: str


def packaged() -> dict[str, Path]:
    """{name: file} of the samples in this installation, in order of name."""
    return {path.name: path for path in sorted(FOLDER.glob("*.csv"))}


@router.get("", summary="The sample logs", responses=documented(500))
async def list_samples() -> list[Sample]:
    return [Sample(name, *ABOUT[name], path.stat().st_size, f"/v1/samples/{name}") for name, path in packaged().items()]


@router.get(
    "/{name}",
    summary="One sample log",
    response_class=Response,
    responses={200: {"content": {"text/csv": {"schema": {"type": "string"}}}}, **documented(404, 500)},
)
async def get_sample(name: Annotated[str, InPath(min_length=1, max_length=100)]) -> FileResponse:
    path = packaged().get(name)
    if path is None:
        raise ProblemError("no-such-sample", "There is no sample log of this name; /v1/samples lists them.")
    return FileResponse(path, media_type="text/csv", filename=name)
