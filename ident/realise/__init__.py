"""Realise: the same controller as a panel, a processor or an op-amp card needs it."""

from ident.realise.card import CardReport, card_as_found, choose_card
from ident.realise.choose_parts import Limits
from ident.realise.network import CardScale, Parts
from ident.realise.realise import Realisations, realise

__all__ = ["CardReport", "CardScale", "Limits", "Parts", "Realisations", "card_as_found", "choose_card", "realise"]
