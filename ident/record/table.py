"""The rows of a log as columns of cells, with their file lines; comments and footers set apart."""

from __future__ import annotations

import io
import re
import warnings
from dataclasses import dataclass

import numpy as np
import pandas as pd

from ident.errors import ReadError
from ident.findings import Finding
from ident.record.dialect import Dialect
from ident.record.segments import Lines

LEAST_ROWS = 5


@dataclass(frozen=True, slots=True)
class Table:
    """Cells by column position.

    cells     one column per field: stamps, numbers where a whole column is numeric, else text; NaN where blank
    line      (n,) file line of each row, counted from 1; a quoted line break counts as none
    """

    cells: pd.DataFrame
    line: Lines
    findings: tuple[Finding, ...]


def read_table(text: bytes, dialect: Dialect, *, time: int | None = None) -> Table:
    """Parse the data rows.

    time    position of a column to read as ISO 8601 stamps where all its cells are such, else left as text

    Raises ReadError: ragged-row, unclosed-quote, unreadable-table, too-few-rows.
    """
    body = text[dialect.offset :]
    try:
        cells = _parsed(body, dialect, time)
    except pd.errors.ParserError as cause:
        raise _explained(str(cause), dialect) from cause
    except pd.errors.ParserWarning as cause:
        # pandas compares each row with the one before; for the first it only warns.
        raise _ragged(dialect.line, "more", dialect.width) from cause
    line = np.arange(len(cells), dtype=np.int64) + dialect.line
    blank = cells.isna().all(axis=1).to_numpy()
    cells, line = cells[~blank], line[~blank]
    findings: list[Finding] = []
    # A comment or footer fills its first field and nothing else.
    short = cells.iloc[:, 1:].isna().all(axis=1).to_numpy(copy=True)
    last_cut = len(cells) > 0 and not body.endswith((b"\n", b"\r")) and bool(cells.iloc[-1, -1:].isna().all())
    if last_cut and not short[-1] and len(cells) > 1 and not cells.iloc[:-1, -1].isna().any():
        short[-1] = True
        findings.append(
            Finding(
                "truncated-tail",
                "warning",
                f"The last line ({line[-1]}) is incomplete and was dropped.",
                {"line": int(line[-1]), "rows_dropped": 1},
            )
        )
    elif short.any():
        findings.append(
            Finding(
                "dropped-lines",
                "warning",
                f"{int(short.sum())} lines with one filled field (comments, a footer) were dropped, "
                f"the first is line {line[short][0]}.",
                {"count": int(short.sum()), "first_line": int(line[short][0])},
            )
        )
    cells, line = cells[~short], line[~short]
    if len(cells) < LEAST_ROWS:
        raise ReadError(
            "too-few-rows",
            f"The log has {len(cells)} rows of data; at least {LEAST_ROWS} are needed, and a useful test has hundreds.",
            {"rows": len(cells)},
        )
    return Table(cells, line, tuple(findings))


def _parsed(body: bytes, dialect: Dialect, time: int | None) -> pd.DataFrame:
    with warnings.catch_warnings():
        warnings.simplefilter("error", pd.errors.ParserWarning)
        return pd.read_csv(
            io.BytesIO(body),
            sep=dialect.delimiter,
            decimal=dialect.decimal,
            header=None,
            names=range(dialect.width),
            index_col=False,
            # Twice as fast as parsing the text afterwards.
            parse_dates=[] if time is None else [time],
            date_format="ISO8601",
            # Words are counted, not swallowed; blank lines are kept so that rows know their line.
            keep_default_na=False,
            na_values=[""],
            skip_blank_lines=False,
            skipinitialspace=True,
            low_memory=False,
        )


def _explained(message: str, dialect: Dialect) -> ReadError:
    ragged = re.search(r"Expected (\d+) fields in line (\d+), saw (\d+)", message)
    if ragged:
        return _ragged(int(ragged[2]) + dialect.line - 1, ragged[3], int(ragged[1]))
    quote = re.search(r"EOF inside string starting at row (\d+)", message)
    if quote:
        line = int(quote[1]) + dialect.line
        return ReadError(
            "unclosed-quote",
            f"A quote opened in line {line} is never closed: mend that line.",
            {"line": line},
        )
    return ReadError("unreadable-table", "The log cannot be read as a table: export it again as CSV.")


def _ragged(line: int, fields: str, expected: int) -> ReadError:
    return ReadError(
        "ragged-row",
        f"Line {line} has {fields} fields where {expected} are expected: is a decimal comma also the delimiter? "
        "Export with semicolons or decimal points.",
        {"line": line, "fields": fields, "expected": expected},
    )
