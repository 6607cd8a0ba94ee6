"""Published rules: settings from a first-order plant with dead time, or from the gain that makes a loop oscillate."""

from ident.tune.rules.amigo import amigo_pi, amigo_pid
from ident.tune.rules.catalogue import Rule, published
from ident.tune.rules.chien_hrones_reswick import chien_hrones_reswick
from ident.tune.rules.cohen_coon import cohen_coon
from ident.tune.rules.imc import imc_pi, imc_pid, lambda_pi
from ident.tune.rules.itae import itae
from ident.tune.rules.tyreus_luyben import tyreus_luyben
from ident.tune.rules.ultimate import Ultimate, ultimate
from ident.tune.rules.ziegler_nichols import ziegler_nichols_step, ziegler_nichols_ultimate

__all__ = [
    "Rule",
    "Ultimate",
    "amigo_pi",
    "amigo_pid",
    "chien_hrones_reswick",
    "cohen_coon",
    "imc_pi",
    "imc_pid",
    "itae",
    "lambda_pi",
    "published",
    "tyreus_luyben",
    "ultimate",
    "ziegler_nichols_step",
    "ziegler_nichols_ultimate",
]
