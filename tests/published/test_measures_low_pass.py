"""A loaded RC low-pass, from an EDIF file: every measure against closed forms, extremes over all vertices.

Formulas: one pole at 1/(R C) with R the Thévenin resistance at the capacitor; sqrt(kT/C) of an RC alone (Nyquist,
Phys. Rev. 32 (1928) 110); 10 to 90 % rise time ln 9 times the time constant.
"""

from __future__ import annotations

import itertools
import math

import pytest
from boardkit import checks_of

PARTS = [
    ("U1", "", {"1": "RAW"}),
    ("R1", "1k|TOLERANCE=1%", {"1": "RAW", "2": "OUT"}),
    ("C1", "100nF|DIELECTRIC=C0G|TOLERANCE=5%|VOLTAGE=50V", {"1": "OUT", "2": "GND"}),
    ("R2", "10k|TOLERANCE=2%", {"1": "OUT", "2": "GND"}),
    ("U2", "", {"1": "OUT"}),
]
BRIEF = """
[board]
mounting_inductance = 0
[[pin]]
at = "U1.1"
drives = "1 V"
resistance = "50 ohm"
[[part]]
match = { refdes = "C1" }
esr = 0
esl = 0
[[filter]]
name = "low"
from = "RAW"
to = "OUT"
corner = "1.6 kHz"
tolerance = "12 %"
attenuation = [ { at = "100 kHz", least = "30 dB" } ]
passband = { to = "500 Hz", ripple = "0.6 dB" }
step = { overshoot = "1 %", settle = "1 ms" }
"""


def reference(r1: float, c: float, r2: float) -> dict[str, float]:
    series = 50.0 + r1
    thevenin = series * r2 / (series + r2)
    tau = thevenin * c

    def loss(f: float) -> float:
        return 10 * math.log10(1 + (2 * math.pi * f * tau) ** 2)

    return {
        "gain": 20 * math.log10(r2 / (series + r2)),
        "corner_high": 1 / (2 * math.pi * tau),
        "attenuation@100kHz": loss(100e3),
        "ripple": loss(500.0),
        "overshoot": 0.0,
        "rise_time": math.log(9) * tau,
        "settling": math.log(100) * tau,
        "noise": math.sqrt(1.380649e-23 * 298.15 / c),
    }


def test_every_measure_and_its_extremes() -> None:
    checks = checks_of(PARTS, BRIEF)
    nominal = reference(1e3, 100e-9, 10e3)
    corners = [
        reference(1e3 * (1 + a), 100e-9 * (1 + b), 10e3 * (1 + c))
        for a, b, c in itertools.product((-0.01, 0.01), (-0.05, 0.05), (-0.02, 0.02))
    ]
    found = {check_id.split(":", 2)[2]: check for check_id, check in checks.items() if check_id.startswith("filter:")}
    assert set(found) == set(nominal)
    for name, expected in nominal.items():
        check = found[name]
        assert check.nominal == pytest.approx(expected, rel=1e-5, abs=1e-9), name
        assert check.low == pytest.approx(min(c[name] for c in corners), rel=1e-5, abs=1e-9), name
        assert check.high == pytest.approx(max(c[name] for c in corners), rel=1e-5, abs=1e-9), name
    assert found["corner_high"].status == "pass"
    assert found["corner_high"].limit is not None
    assert found["gain"].status == "watched"
