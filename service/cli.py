"""The command `gainwright`: serve the page and the API, or report on one log.

Exit status: 0 done, 1 a fault of the program, 2 a log or an option that cannot be used.
"""

from __future__ import annotations

import argparse
import shutil
import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any, Literal, get_args, get_origin

from pydantic import ValidationError

from service.errors import Problem
from service.settings import PREFIX, Settings
from service.version import version
from service.work.options import Options, wrong_options
from service.work.threads import one_blas_thread

# Whatever imports numpy is imported in a function below, after the number of BLAS threads is set.


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command; `arguments` without the program's name, None: those of the process."""
    one_blas_thread()
    asked = parser().parse_args(arguments)
    try:
        return int(asked.run(asked))
    except KeyboardInterrupt:
        return 130


def parser() -> argparse.ArgumentParser:
    top = argparse.ArgumentParser(
        prog="gainwright",
        description="From the log of a motor speed loop to its model, and to PI settings that stay robust.",
        epilog="Example: gainwright report monday.csv --summary",
    )
    top.add_argument("--version", action="version", version=f"gainwright {version()}")
    commands = top.add_subparsers(title="commands", required=True, metavar="serve | report | preview")
    serve = commands.add_parser(
        "serve",
        help="start the service: the page for the browser and the HTTP interface",
        description="Start the service and say where its page is. Ctrl-C stops it. "
        f"Every other setting is an environment variable {PREFIX}...; the README lists them.",
    )
    serve.add_argument("--host", help="address to listen on (127.0.0.1: this machine only)")
    serve.add_argument("--port", help="port to listen on (8000); 0 takes a free one")
    serve.set_defaults(run=_serve)
    report = commands.add_parser(
        "report",
        help="analyse one log and print the report",
        description="Analyse a CSV log with columns for time, command and measured speed (and the setpoint, "
        "if it was logged) and print the report as JSON. The log is only read.",
    )
    report.add_argument("file", metavar="FILE", help="the log; - reads standard input")
    report.add_argument("--summary", action="store_true", help="print a summary to read instead of JSON")
    _add_options(report)
    report.set_defaults(run=_report, preview=False)
    preview = commands.add_parser(
        "preview",
        help="say how a log is understood, without fitting",
        description="Read a CSV log and print as JSON what was understood: stamps, sample time, which header became "
        "which column and why, rows left out, gaps. Options that are not about reading do not count.",
    )
    preview.add_argument("file", metavar="FILE", help="the log; - reads standard input")
    _add_options(preview)
    preview.set_defaults(run=_report, summary=False, preview=True)
    return top


def _add_options(report: argparse.ArgumentParser) -> None:
    group = report.add_argument_group("options (each also a query option of POST /v1/reports and /v1/logs/preview)")
    for name, field in Options.model_fields.items():
        spellings = dict.fromkeys((f"--{name.replace('_', '-')}", f"--{name}"))
        choices = _choices(field.annotation)
        default = "" if field.default is None else f" (default {field.default})"
        group.add_argument(
            *spellings,
            dest=f"option_{name}",
            metavar="|".join(choices) if choices else name.upper() if name != "Ms" else name,
            help=f"{field.description}{default}".replace("%", "%%"),
        )


def _choices(annotation: Any) -> tuple[str, ...]:
    """The words that a Literal, alone or in a union, allows."""
    if get_origin(annotation) is Literal:
        return get_args(annotation)
    return tuple(word for part in get_args(annotation) for word in _choices(part))


def _serve(asked: argparse.Namespace) -> int:
    given: dict[str, Any] = {"host": asked.host, "port": asked.port}
    try:
        settings = Settings(**{name: value for name, value in given.items() if value is not None})
    except ValidationError as error:
        for fault in error.errors():
            name = str(fault["loc"][-1])
            print(f"gainwright: {name} ({PREFIX}{name.upper()}): {fault['msg']}", file=sys.stderr)
        return 2
    from service.work.worker import context

    context()  # its process loads the numerics while this one loads the service
    from service.serve import serve

    return serve(settings)


def _report(asked: argparse.Namespace) -> int:
    given = {name: getattr(asked, f"option_{name}") for name in Options.model_fields}
    try:
        options = Options.model_validate({name: text for name, text in given.items() if text is not None})
    except ValidationError as error:
        return _refuse(wrong_options(error))
    from service.work.previewing import preview_bytes
    from service.work.report import report_bytes, report_summary

    task = preview_bytes if asked.preview else report_summary if asked.summary else report_bytes
    try:
        with _file(asked.file) as file:
            answer = task(file, options)
    except OSError as error:
        return _refuse(Problem("unreadable-file", f"{asked.file} cannot be opened: {error.strerror}."))
    if isinstance(answer, Problem):
        return _refuse(answer)
    output = answer.encode() if isinstance(answer, str) else answer
    sys.stdout.buffer.write(output)
    # The bytes are those of the HTTP answer; only a terminal wants its prompt on a new line.
    if sys.stdout.isatty() and not output.endswith(b"\n"):
        sys.stdout.buffer.write(b"\n")
    sys.stdout.buffer.flush()
    return 0


@contextmanager
def _file(name: str) -> Iterator[Path]:
    """The log as a file that can be opened. Raises OSError."""
    if name != "-":
        Path(name).open("rb").close()
        yield Path(name)
        return
    with TemporaryDirectory() as folder:
        file = Path(folder) / "log"
        with file.open("wb") as log:
            shutil.copyfileobj(sys.stdin.buffer, log)
        yield file


def _refuse(problem: Problem) -> int:
    print(f"gainwright: {problem.detail}\n  code: {problem.code}", file=sys.stderr)
    return 1 if problem.code == "internal" else 2


if __name__ == "__main__":
    sys.exit(main())
