"""Plants: parameters, frequency response, exact response to a held command, a motor's nameplate."""

from ident.plants.arx import Arx
from ident.plants.fopdt import Fopdt
from ident.plants.motor import Motor, from_nameplate
from ident.plants.plant import Plant
from ident.plants.sopdt import Sopdt, UnderdampedSopdt

__all__ = ["Arx", "Fopdt", "Motor", "Plant", "Sopdt", "UnderdampedSopdt", "from_nameplate"]
