"""The page: index.html at /, its scripts and style under /page/."""

from __future__ import annotations

from pathlib import Path

from fastapi import FastAPI
from starlette.requests import Request
from starlette.responses import FileResponse
from starlette.staticfiles import StaticFiles

FOLDER = Path(__file__).resolve().parents[1] / "page"


async def index(_: Request) -> FileResponse:
    return FileResponse(FOLDER / "index.html")


def install(app: FastAPI) -> None:
    app.add_route("/", index, include_in_schema=False)
    app.mount("/page", StaticFiles(directory=FOLDER), name="page")
