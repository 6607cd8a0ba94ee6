"""What a header says: the usual words for time, setpoint, command and speed, and the unit beside them."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass


def _words(text: str) -> frozenset[str]:
    return frozenset(text.split())


# English, German, French, Spanish, Italian; without accents, ß as ss, ö as o or oe.
TIME = _words(
    """time timestamp t datetime zeit zeitstempel zeitpunkt uhrzeit temps heure horodatage horodate tiempo
    hora tempo ora elapsed sourcetimestamp servertimestamp epoch"""
)
DATE = _words("date datum fecha data jour")
SETPOINT = _words(
    """sp sv r setpoint setpt set reference ref target soll sollwert solldrehzahl drehzahlsollwert setpunkt
    fuhrungsgrosse fuehrungsgroesse consigne consigna referencia riferimento"""
)
COMMAND = _words(
    """command cmd co op out mv u manipulated actuator actuation duty dutycycle pwm stellgrosse stellgroesse
    stellwert stellsignal reglerausgang commande comando mando"""
)
SPEED = _words(
    """speed pv rpm rps tacho tachometer velocity omega drehzahl istdrehzahl drehzahlistwert geschwindigkeit
    vitesse regime velocidad velocita giri"""
)
MEASURED = _words(
    """measured measurement actual act feedback ist istwert mesure mesuree mesura medida medido misura
    misurata"""
)
OUTPUT = _words("output y ausgang sortie salida uscita")
INPUT = _words("input eingang entree entrada ingresso")
CONTROLLER = _words("controller control regler regulateur regulador controlador regolatore pid pi")
# What a drive is commanded by; beside a word for command they say no more than it.
EFFORT = _words(
    """torque moment drehmoment couple par coppia current strom courant corriente corrente voltage spannung
    tension tensione"""
)
# Words that make a signal something else than one of the four, whatever stands beside them.
OTHER = _words(
    """error err deviation abweichung regelabweichung erreur ecart errore limit limits limite max min maximum
    minimum alarm alarme temperature temperatur temp angle winkel acceleration power leistung
    pressure druck flow"""
)
COUNTS = _words("count counts encoder pulse pulses impulse impulses ticks increments inkremente position pos")
TAG = _words("tag tagname tagid point pointname variable varname item itemname channel signal kanal name")
VALUE = _words("value wert valeur valor valore val")
QUALITY = _words(
    """status statuscode quality opcquality qualitat qualitaet qualite calidad qualita
    state zustand etat estado stato"""
)
MODE = _words("mode modus betriebsart modo modalita")
AMBIGUOUS = _words("cv")

TIME_UNITS = {
    **dict.fromkeys(("s", "sec", "secs", "second", "seconds", "sek"), 1.0),
    **dict.fromkeys(("ms", "msec"), 1e-3),
    **dict.fromkeys(("us", "µs", "μs"), 1e-6),  # the micro sign and the Greek letter
    "ns": 1e-9,
    "min": 60.0,
    "h": 3600.0,
}
UTC_NAMES = _words("utc gmt z")
_SPEED_UNITS = _words("rpm 1/min min-1 u/min tr/min rad/s rps rev/s hz m/min m/s deg/s °/s turns/s g/min giri/min")
_UNITS = _SPEED_UNITS | UTC_NAMES | _words("% pct percent v mv volt a ma nm s ms us ns sec local iso iso8601 -")
_SUFFIXES = {
    **{unit: unit for unit in ("rpm", "rps", "%", "s", "ms", "us", "ns", "sec", "utc")},
    **dict.fromkeys(("pct", "percent"), "%"),
    **dict.fromkeys(("v", "volt", "volts"), "V"),
    "ma": "mA",
    "hz": "Hz",
}
_BRACKETED = re.compile(r"(.*?)[\s_]*[\[(]([^\])]*)[\])]\s*")


@dataclass(frozen=True, slots=True)
class Header:
    """One header: its words without accents, and its unit ("" where it names none)."""

    text: str
    words: tuple[str, ...]
    unit: str


def understand(text: str) -> Header:
    """Split a header into words and unit: "Drehzahl [1/min]", "speed_rpm", "SIC101.PV", "rpm"."""
    base, unit = text.strip(), ""
    if bracketed := _BRACKETED.fullmatch(base):
        base, unit = bracketed[1], bracketed[2].strip()
    elif base.casefold() in _SPEED_UNITS:
        return Header(text, ("speed",), base)
    elif base.casefold() in TIME_UNITS:
        return Header(text, ("time",), base)
    elif (parts := base.rsplit(maxsplit=1)) and len(parts) == 2 and parts[1].casefold() in _SPEED_UNITS - SPEED:
        base, unit = parts
    # A full tag path: the signal is named by its last part.
    tail = re.split(r"[./\\:|]", base)[-1]
    if tail != base and re.fullmatch(r"[A-Za-z]{1,12}[0-9]*", tail):
        base = tail
    words = _split(base)
    if not unit and len(words) > 1 and words[-1] in _SUFFIXES:
        unit = _SUFFIXES[words[-1]]
        if unit not in SPEED:
            words.pop()
    # A single letter is a name only where it stands alone.
    return Header(text, tuple(w for w in words if len(w) > 1 or len(words) == 1), unit)


def _split(text: str) -> list[str]:
    spaced = re.sub(r"(?<=[a-z])(?=[A-Z])", " ", text)
    plain = unicodedata.normalize("NFKD", spaced.casefold())
    plain = "".join(c for c in plain if not unicodedata.combining(c))
    # Loops are numbered: PV1, speed2.
    return [re.sub(r"(?<=[^\W\d_]{2})\d+$", "", word) for word in re.findall(r"%|[^\W_]+", plain)]


def is_unit(text: str) -> bool:
    """Whether a cell of a units row is a unit (or blank)."""
    return not text or text.strip("[]() ").casefold() in _UNITS


def meaning(header: Header) -> str | None:
    """What a column holds.

    time, date, setpoint, command or speed; output or input where only the other columns can tell; cv where
    nothing can; quality for a status column, mode for manual or automatic, counts for an encoder; tag and value
    for logs with one row per signal; None where no word is known or the words contradict each other.
    """
    words = {*header.words, "".join(header.words)}
    if words & MODE:
        return "mode"
    if words & QUALITY:
        return "quality"
    if words & AMBIGUOUS:
        return "cv"
    if words & TIME and not words & (SPEED | COMMAND | SETPOINT | OTHER):
        return "time"
    if words & DATE:
        return "date"
    if words & OTHER:
        return None
    if words & COUNTS and not words & (SETPOINT | COMMAND):
        return "counts"
    controlled = bool(words & OUTPUT) and bool(words & CONTROLLER)
    roles = {
        "setpoint": bool(words & SETPOINT),
        "command": bool(words & COMMAND) or controlled,
        "speed": bool(words & (SPEED | MEASURED)),
    }
    if words & EFFORT:
        return "command" if roles == {"setpoint": False, "command": True, "speed": False} else None
    if roles["setpoint"] and not roles["command"]:
        return "setpoint"
    if roles["command"] or roles["speed"]:
        # "speed command" may be either: it is asked for.
        named = [role for role, said in roles.items() if said]
        return named[0] if len(named) == 1 else None
    if len(header.words) == 1 and words & (OUTPUT | INPUT):
        return "output" if words & OUTPUT else "input"
    if words & TAG:
        return "tag"
    return "value" if words & VALUE else None
