"""Plants: parameters, frequency response, exact response to a held command."""

from ident.plants.arx import Arx
from ident.plants.fopdt import Fopdt
from ident.plants.plant import Plant
from ident.plants.sopdt import Sopdt, UnderdampedSopdt

__all__ = ["Arx", "Fopdt", "Plant", "Sopdt", "UnderdampedSopdt"]
