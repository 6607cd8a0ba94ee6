"""The OpenAPI document, with problems under their own media type."""

from __future__ import annotations

from typing import Any

from fastapi import FastAPI
from fastapi.openapi.utils import get_openapi

from service.api.problems import MEDIA_TYPE


def install(app: FastAPI) -> None:
    """FastAPI documents every answer of a route under the route's own media type; problems have another."""

    def openapi() -> dict[str, Any]:
        if app.openapi_schema is None:
            app.openapi_schema = _with_problems(
                get_openapi(title=app.title, version=app.version, description=app.description, routes=app.routes)
            )
        return app.openapi_schema

    app.openapi = openapi  # type: ignore[method-assign]


def _with_problems(schema: dict[str, Any]) -> dict[str, Any]:
    for path in schema["paths"].values():
        for operation in path.values():
            for status, answer in operation["responses"].items():
                if int(status) >= 400:
                    (described,) = answer["content"].values()
                    answer["content"] = {MEDIA_TYPE: described}
    return schema
