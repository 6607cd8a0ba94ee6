"""Headers and what they mean. The words are the trade's common practice (no source); ../shared/odd_logs/README.md
and ecosystem.md section 7 say which are ambiguous."""

from __future__ import annotations

import pytest

from ident.record.columns import map_columns
from ident.record.vocabulary import meaning, understand


@pytest.mark.parametrize(
    ("header", "role", "unit"),
    [
        ("t_s", "time", "s"),
        ("Time (ms)", "time", "ms"),
        ("SourceTimestamp", "time", ""),
        ("Date/Time", "time", ""),
        ("Datum", "date", ""),
        ("Sollwert [1/min]", "setpoint", "1/min"),
        ("n_soll", "setpoint", ""),
        ("Speed Reference", "setpoint", ""),
        ("set point", "setpoint", ""),
        ("Stellgröße [%]", "command", "%"),
        ("STELLGROESSE", "command", ""),
        ("command (%)", "command", "%"),
        ("Controller Output", "command", ""),
        ("torque command", "command", ""),
        ("Plant/Area/SIC101.OUT", "command", ""),
        ("u_V", "command", "V"),
        ("Drehzahl 1/min", "speed", "1/min"),
        ("speed_rpm", "speed", "rpm"),
        ("Motor RPM", "speed", "rpm"),
        ("rad/s", "speed", "rad/s"),
        ("SIC101.PV", "speed", ""),
        ("measured output", "speed", ""),
        ("Vitesse mesurée (tr/min)", "speed", "tr/min"),
        ("output", "output", ""),
        ("y", "output", ""),
        ("CV", "cv", ""),
        ("StatusCode", "quality", ""),
        ("speed command", None, ""),
        ("torque reference", None, ""),
        ("control error", None, ""),
        ("Speed limit", None, ""),
        ("Phase U voltage", None, ""),
        ("Value", "value", ""),
        ("TagName", "tag", ""),
        ("Position", "counts", ""),
        ("MODE", "mode", ""),
        ("", None, ""),
    ],
)
def test_headers(header: str, role: str | None, unit: str) -> None:
    understood = understand(header)
    assert (meaning(understood), understood.unit) == (role, unit)


def test_units_row_below_the_header_names_the_units() -> None:
    mapped = map_columns((("Timestamp", "SP", "CO", "PV"), ("UTC", "rpm", "%", "rpm")), 4, None)
    assert mapped.index == {"time": 0, "setpoint": 1, "command": 2, "speed": 3}
    assert mapped.units == {"time": "UTC", "setpoint": "rpm", "command": "%", "speed": "rpm"}


def test_a_units_row_as_the_only_header_is_kept() -> None:
    assert map_columns((("s", "command", "rpm"),), 3, None).index == {"time": 0, "command": 1, "speed": 2}
