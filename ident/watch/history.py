"""History: a verdict for each night in the order of their own time, and since when the loop has been off."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from datetime import datetime
from itertools import chain
from typing import TypeVar

from ident.loop import PidSettings
from ident.watch.baseline import baseline_of
from ident.watch.drift import as_night, with_margin
from ident.watch.margin import Controller, SettingsFrom
from ident.watch.night import Estimated, Night
from ident.watch.sizes import PracticalSize
from ident.watch.verdict import Drift, ParameterDrift, Verdict, verdict

Key = TypeVar("Key", datetime, str)


def drift_history(
    baseline: Sequence[Night | Estimated],
    nights: Iterable[tuple[Key, Night | Estimated | None]],
    *,
    settings: PidSettings | None = None,
    settings_from: SettingsFrom = "installed",
    period: float = 0.0,
    compute_delay: float = 0.0,
    target: float = 1.6,
    significance: float = 0.0027,
    practical: PracticalSize | None = None,
    seed: int = 0,
) -> tuple[tuple[Key, Drift], ...]:
    """Verdicts of many nights, in the order of their keys, whatever order they came in.

    nights   (key, night) in any order, the baseline's own left out; the key is the log's time: an aware datetime, or
             text that sorts as time does, such as RFC 3339 in UTC. Nights of one key are ordered by their numbers
    `since` is the key of the first night of a run of "moved" that no "not-moved" has ended; "no-news" neither begins
    nor ends one. The last night alone carries the margin; the others' is None. The rest as in `drift`.
    """
    level = baseline_of(baseline, practical or PracticalSize())
    ordered: list[tuple[Key, Night | None]] = sorted(
        ((key, as_night(given)) for key, given in nights), key=lambda entry: (entry[0], _numbers(entry[1]))
    )
    run: dict[str, Key] = {}
    found: list[tuple[Key, Drift]] = []
    for key, night in ordered:
        said = verdict(level, night, significance)
        parameters: dict[str, ParameterDrift] = {}
        for name, parameter in said.parameters.items():
            parameters[name] = replace(parameter, since=_since(run, name, parameter.verdict, key))
        found.append((key, replace(said, parameters=parameters, since=_since(run, "", said.verdict, key))))
    if found:
        key, last = found[-1]
        controller = Controller(settings, settings_from, period, compute_delay, target)
        found[-1] = (key, with_margin(last, level, ordered[-1][1], controller, seed))
    return tuple(found)


def _numbers(night: Night | None) -> tuple[float, ...]:
    return () if night is None else (night.K, night.T, night.L, *chain(*night.covariance))


def _since(run: dict[str, Key], name: str, said: Verdict, key: Key) -> Key | None:
    """The run's first key after this verdict; `run` holds one entry for each run that is on."""
    if said == "moved":
        run.setdefault(name, key)
    elif said == "not-moved":
        run.pop(name, None)
    return run.get(name)
