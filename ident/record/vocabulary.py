"""What a header says: the trade's usual words for time, setpoint, command and speed, and the unit beside them."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass


def _words(text: str) -> frozenset[str]:
    return frozenset(text.split())


# English, German, French, Spanish, Italian; without accents, ß as ss, ö as o or oe.
TIME = _words(
    "time timestamp t datetime zeit zeitstempel zeitpunkt uhrzeit temps heure horodatage horodate tiempo hora "
    "tempo ora elapsed sourcetimestamp servertimestamp epoch"
)
DATE = _words("date datum fecha data jour tag")
SETPOINT = _words(
    "sp sv setpoint setpt set reference ref target soll sollwert solldrehzahl fuhrungsgrosse fuehrungsgroesse "
    "consigne reference consigna referencia riferimento setpunkt drehzahlsollwert r"
)
COMMAND = _words(
    "command cmd co op out mv u stellgrosse stellgroesse stellwert stellsignal commande comando mando manipulated "
    "actuator actuation duty dutycycle pwm"
)
SPEED = _words(
    "speed pv rpm tacho tachometer velocity drehzahl istdrehzahl drehzahlistwert geschwindigkeit vitesse velocidad "
    "velocita regime giri tours revolutions rps"
)
MEASURED = _words(
    "measured measurement actual act ist istwert feedback mesure mesuree mesura medida medido misurata misura real reale"
)
WEAK = _words("output y ausgang sortie salida uscita")
INPUT = _words("input eingang entree entrada ingresso")
CONTROLLER = _words("controller control regler regulateur regulador controlador regolatore pid pi")
# Words that make a signal something else than one of the four, whatever stands beside them.
OTHER = _words(
    "error err deviation abweichung regelabweichung erreur ecart errore limit limits limite max min maximum minimum "
    "alarm alarme torque moment drehmoment couple par coppia current strom courant corriente corrente temperature "
    "temperatur temp voltage spannung tension position pos angle winkel acceleration power leistung pressure druck "
    "flow status quality mode counts count encoder"
)
QUALITY = _words(
    "status statuscode quality qualitat qualitaet qualite calidad qualita mode modus betriebsart opcquality"
)
AMBIGUOUS = _words("cv")

TIME_UNITS = {"s": 1.0, "sec": 1.0, "secs": 1.0, "seconds": 1.0, "sek": 1.0, "ms": 1e-3, "msec": 1e-3, "us": 1e-6, "µs": 1e-6,
              "μs": 1e-6, "ns": 1e-9, "min": 60.0, "h": 3600.0}  # fmt: skip
_SUFFIX_UNITS = _words("rpm rps hz pct percent % v volt volts ma s ms us ns sec")
_UNIT_ROW = _words(
    "rpm 1/min min-1 u/min tr/min rad/s rps rev/s hz m/min m/s % pct percent v mv volt a ma nm s ms us ns sec utc local "
    "iso iso8601 - deg/s °/s turns/s g/min giri/min"
)
_BRACKETED = re.compile(r"(.*?)[\s_]*[\[(]([^\])]*)[\])]\s*")


@dataclass(frozen=True, slots=True)
class Header:
    """One header: its words without accents, and its unit ("" where it names none)."""

    text: str
    words: tuple[str, ...]
    unit: str


def understand(text: str) -> Header:
    """Split a header into words and unit: "Drehzahl [1/min]", "speed_rpm", "SIC101.PV"."""
    bracketed = _BRACKETED.fullmatch(text)
    base, unit = (bracketed[1], bracketed[2].strip()) if bracketed else (text, "")
    if not bracketed and base.strip().casefold() in _UNIT_ROW - {"-", "mv", "a", "s", "v", "t"}:
        return Header(text, ("speed",) if base.strip().casefold() in _SPEED_UNITS else (), base.strip())
    # A full tag path: the signal is named by its last part.
    tail = re.split(r"[./\\:|]", base.strip())[-1]
    if re.fullmatch(r"[A-Za-z]{1,12}", tail) and len(_split(tail)) == 1 and len(tail) < len(base.strip()):
        base = tail
    words = _split(base)
    if not unit and len(words) > 1 and words[-1] in _SUFFIX_UNITS:
        *words, unit = words
        unit = "%" if unit in {"pct", "percent"} else unit
        unit = {"v": "V", "volt": "V", "volts": "V", "ma": "mA", "hz": "Hz"}.get(unit, unit)
    return Header(text, tuple(words), unit)


_SPEED_UNITS = _words(
    "rpm 1/min min-1 u/min tr/min rad/s rps rev/s hz m/min m/s deg/s °/s turns/s g/min giri/min"
)


def _split(text: str) -> list[str]:
    spaced = re.sub(r"(?<=[a-z])(?=[A-Z])", " ", text)
    plain = unicodedata.normalize("NFKD", spaced.casefold())
    plain = "".join(c for c in plain if not unicodedata.combining(c))
    return re.findall(r"%|[^\W_]+", plain)


def is_unit(text: str) -> bool:
    """Whether a cell of a units row is a unit (or blank)."""
    return not text or text.strip("[]() ").casefold() in _UNIT_ROW


def meaning(header: Header) -> str | None:
    """time, date, setpoint, command, speed; output or input where only the other columns can tell; cv where
    nothing can; quality for a status column; None where no word is known or the words contradict each other."""
    words = set(header.words)
    joined = "".join(header.words)
    if words & QUALITY or joined in QUALITY:
        return "quality"
    if words & AMBIGUOUS:
        return "cv"
    if joined in TIME or (words & TIME and not words & (SPEED | MEASURED | COMMAND | SETPOINT | OTHER)):
        return "time"
    if joined in DATE:
        return "date"
    if words & OTHER:
        return None
    setpoint = bool(words & SETPOINT) or joined in SETPOINT
    command = bool(words & COMMAND) or joined in COMMAND
    speed = bool(words & (SPEED | MEASURED)) or joined in SPEED
    output = bool(words & WEAK)
    if output and words & CONTROLLER:
        command, output = True, False
    if output and words & MEASURED:
        output = False
    if setpoint and not command:
        return "setpoint"
    if command and not (setpoint or speed or (output and "out" not in words and "command" not in words)):
        return "command"
    if speed and not (command or setpoint):
        return "speed"
    if output and len(words) == 1:
        return "output"
    if words & INPUT and len(words) == 1:
        return "input"
    return None
