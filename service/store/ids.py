"""Ids of logs, analyses and reports: made from what they name, so that the same thing has one id for ever."""

from __future__ import annotations

import hashlib

DIGITS = 32  # hexadecimal: 128 bits


def log_id(loop: str, sha256: str) -> str:
    return _id("log", loop, sha256)


def analysis_id(log: str, options: str) -> str:
    return _id("ana", log, options)


def report_id(analysis: str) -> str:
    return _id("rep", analysis)


def _id(kind: str, *parts: str) -> str:
    # No part but the last may hold a line feed: names of loops have no control characters, the others are hex.
    return f"{kind}_{hashlib.sha256(chr(10).join((kind, *parts)).encode()).hexdigest()[:DIGITS]}"
