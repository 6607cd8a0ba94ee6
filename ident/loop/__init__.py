"""The loop: controller settings, margins, closed-loop simulation."""

from ident.loop.law import ControlLaw, law_loop, law_margins
from ident.loop.margins import Margins, margins
from ident.loop.settings import PidSettings

__all__ = ["ControlLaw", "Margins", "PidSettings", "law_loop", "law_margins", "margins"]
