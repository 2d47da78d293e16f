"""What is used where neither export nor brief states it. All of it is common practice or from memory.

Each figure that is used is listed among a part's assumptions.
"""

from __future__ import annotations

import math

from reactance.analysis.parts.capacitor import Technology

CLASS_I_UP_TO = 1e-9  # F: a ceramic with no stated dielectric is C0G up to here, X7R above (common practice)
ALUMINIUM_ABOVE = 100e-6  # F: a part of which nothing but the value is known is no ceramic above (common practice)

TOLERANCE_CLASS_I = 0.05
TOLERANCE_CLASS_II = 0.10
TOLERANCE_FILM = 0.10  # from memory
TOLERANCE_ELECTROLYTIC = 0.20  # aluminium, tantalum and polymer
TOLERANCE_RESISTOR = 0.01
TOLERANCE_INDUCTOR = 0.20
TOLERANCE_BEAD = 0.25

LOSS_TANGENT: dict[Technology, float] = {"film": 0.005, "aluminium": 0.0, "tantalum": 0.0, "polymer": 0.0}
LOSS_TANGENT_CLASS_I = 0.001
LOSS_TANGENT_CLASS_II = 0.025

ESR: dict[Technology, float] = {"ceramic": 5e-3, "film": 5e-3, "tantalum": 0.5, "polymer": 25e-3}
ALUMINIUM_LOSS = 0.15  # tan delta at 120 Hz, from which R_s at every frequency; pessimistic above a few kHz

ESL: dict[Technology, float] = {"film": 8e-9, "aluminium": 10e-9, "tantalum": 2e-9, "polymer": 2e-9}

LEAKAGE_PER_CHARGE = 0.01  # A per C V (F times V): aluminium and tantalum, I = 0.01 C V

DERATING: dict[Technology, float] = {
    "ceramic": 0.8,
    "film": 0.8,
    "polymer": 0.8,
    "tantalum": 0.5,  # with MnO2
    "aluminium": 0.8,
}


def aluminium_resistance(capacitance: float) -> float:
    """R_s in ohm of an aluminium electrolytic of `capacitance` farad: 0.15/(2 pi 120 Hz C)."""
    return ALUMINIUM_LOSS / (2.0 * math.pi * 120.0 * capacitance)
