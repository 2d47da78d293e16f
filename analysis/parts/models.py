"""All part models under one name."""

from __future__ import annotations

from reactance.analysis.parts.base import Assumption, Conditions, Kind, Model, OtherModel, Stated
from reactance.analysis.parts.bead import BeadModel
from reactance.analysis.parts.capacitor import CapacitorModel
from reactance.analysis.parts.inductor import InductorModel
from reactance.analysis.parts.resistor import ResistorModel

PartModel = CapacitorModel | ResistorModel | InductorModel | BeadModel | OtherModel

__all__ = [
    "Assumption",
    "BeadModel",
    "CapacitorModel",
    "Conditions",
    "InductorModel",
    "Kind",
    "Model",
    "OtherModel",
    "PartModel",
    "ResistorModel",
    "Stated",
]
