"""The laws of flow ductsolve knows, by name; all numbers in SI."""

from ductsolve.rheology.power import Bingham, HerschelBulkley, Newtonian, PowerLaw
from ductsolve.rheology.viscous import CarreauYasuda, Cross, Ellis, Sisko
from ductsolve.rheology.yielding import Casson, RobertsonStiff

__all__ = [
    "Newtonian",
    "PowerLaw",
    "Bingham",
    "HerschelBulkley",
    "Casson",
    "CarreauYasuda",
    "Cross",
    "Ellis",
    "Sisko",
    "RobertsonStiff",
]
