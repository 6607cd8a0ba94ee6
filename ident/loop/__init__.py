"""The loop: controller settings, margins, closed-loop simulation."""

from ident.loop.margins import Margins, margins
from ident.loop.settings import PidSettings

__all__ = ["Margins", "PidSettings", "margins"]
