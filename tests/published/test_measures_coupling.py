"""A coupling between two bias points, from an EDIF file, against closed forms (superposition, one pole)."""

from __future__ import annotations

import itertools
import math

import pytest
from boardkit import checks_of

PARTS = [
    ("U1", "", {"1": "MIC"}),
    ("C1", "1uF|TECHNOLOGY=film|TOLERANCE=5%|VOLTAGE=63V", {"1": "MIC", "2": "AMP"}),
    ("R1", "100k|TOLERANCE=1%", {"1": "+5V", "2": "AMP"}),
    ("R2", "47k|TOLERANCE=1%", {"1": "AMP", "2": "GND"}),
    ("U2", "", {"3": "AMP"}),
]
BRIEF = """
[board]
mounting_inductance = 0
[[rail]]
net = "+5V"
voltage = "5 V"
[[pin]]
at = "U1.1"
drives = "0.8 V"
resistance = "2.2 kohm"
[[pin]]
at = "U2.3"
resistance = "1 Mohm"
bias_current = "20 nA"
greatest_voltage = "3.6 V"
least_voltage = "-0.3 V"
[[part]]
match = { refdes = "C1" }
esr = 0
esl = 0
[[coupling]]
name = "mic"
from = "MIC"
to = "AMP"
lowest_frequency = "20 Hz"
loss = "0.5 dB"
settle = { within = "10 mV", time = "500 ms" }
tilt = { pulse = "1 ms", most = "5 %" }
"""
RS, RIN, IB = 2200.0, 1e6, 20e-9


def reference(c: float, r1: float, r2: float) -> dict[str, float]:
    conductance = 1 / r1 + 1 / r2 + 1 / RIN
    rth = 1 / conductance
    bias = (5.0 / r1 - IB) * rth
    tau = (RS + rth) * c
    start = (0.8 / RS + 5.0 / r1 - IB) / (1 / RS + conductance)  # the empty capacitor is a short at first
    corner = 1 / (2 * math.pi * tau)
    return {
        "dc": 0.8 - bias,
        "gain": 20 * math.log10(rth / (RS + rth)),
        "corner": corner,
        "loss": 10 * math.log10(1 + (corner / 20.0) ** 2),
        "settling": tau * math.log(abs(start - bias) / 10e-3),
        "startup_peak": max(start, bias, key=abs),
        "tilt": 1 - math.exp(-1e-3 / tau),
        "rejection@+5V": -20 * math.log10(ripple(c, r1, rth)),
    }


def ripple(c: float, r1: float, rth: float) -> float:
    """Greatest |V(to)/V(rail)| from 10 Hz to 20 kHz: it falls with frequency."""
    branch = RS + 1 / (2j * math.pi * 10.0 * c)
    return abs((1 / r1) / (1 / rth + 1 / branch))


def test_every_measure_and_its_extremes() -> None:
    checks = checks_of(PARTS, BRIEF)
    corners = [
        reference(1e-6 * (1 + a), 100e3 * (1 + b), 47e3 * (1 + d))
        for a, b, d in itertools.product((-0.05, 0.05), (-0.01, 0.01), (-0.01, 0.01))
    ]
    found = {check_id.split(":", 2)[2]: check for check_id, check in checks.items() if check_id.startswith("coupling:")}
    nominal = reference(1e-6, 100e3, 47e3)
    assert set(found) == set(nominal)
    for name, expected in nominal.items():
        check = found[name]
        assert check.nominal == pytest.approx(expected, rel=1e-5), name
        assert check.low == pytest.approx(min(c[name] for c in corners), rel=1e-5), name
        assert check.high == pytest.approx(max(c[name] for c in corners), rel=1e-5), name
    assert found["startup_peak"].limit is not None
    assert found["startup_peak"].limit.max == 3.6
    assert found["startup_peak"].limit.min == -0.3
