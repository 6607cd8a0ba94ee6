"""Plants: parameters, frequency response, exact response to a held command."""

from ident.plants.fopdt import Fopdt
from ident.plants.plant import Plant

__all__ = ["Fopdt", "Plant"]
