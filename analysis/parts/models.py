"""The union of all part models."""

from __future__ import annotations

from reactance.analysis.parts.base import OtherModel
from reactance.analysis.parts.bead import BeadModel
from reactance.analysis.parts.capacitor import CapacitorModel
from reactance.analysis.parts.inductor import InductorModel
from reactance.analysis.parts.resistor import ResistorModel

PartModel = CapacitorModel | ResistorModel | InductorModel | BeadModel | OtherModel
