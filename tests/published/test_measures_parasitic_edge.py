"""A low-pass with real capacitors: the picosecond spike that L_s lets through is no rise, no overshoot, no noise.

R_s = 5 mΩ and L_s = 1 nH move the closed forms of an ideal RC (rise time ln 9 · RC, corner 1/(2π RC), noise sqrt(kT/C))
by shares of R_s/R = 5e-6 only.
"""

from __future__ import annotations

import math

import pytest
from boardkit import checks_of

PARTS = [
    ("U1", "", {"1": "RAW"}),
    ("R1", "1k|TOLERANCE=1%", {"1": "RAW", "2": "OUT"}),
    ("C1", "100nF|DIELECTRIC=C0G|TOLERANCE=5%|VOLTAGE=50V", {"1": "OUT", "2": "GND"}),
    ("U2", "", {"1": "OUT"}),
]
BRIEF = """
[[pin]]
at = "U1.1"
drives = "1 V"
[[part]]
match = { refdes = "C1" }
esr = "5 mohm"
esl = "0.5 nH"
[[filter]]
name = "low"
from = "RAW"
to = "OUT"
"""


def test_parasitics_do_not_pose_as_signal() -> None:
    found = {key.split(":", 2)[2]: check for key, check in checks_of(PARTS, BRIEF).items() if key.startswith("filter:")}
    tau = 1e3 * 100e-9
    shortest, longest = 0.95 * 0.99, 1.05 * 1.01
    for name, expected, least in (
        ("rise_time", math.log(9) * tau, shortest),
        ("corner_high", 1 / (2 * math.pi * tau), 1 / longest),
        ("settling", math.log(100) * tau, shortest),
    ):
        assert found[name].nominal == pytest.approx(expected, rel=2e-5), name
        assert found[name].low == pytest.approx(expected * least, rel=2e-5), name
    assert found["overshoot"].nominal == pytest.approx(0.0, abs=1e-6)
    assert found["noise"].nominal == pytest.approx(math.sqrt(1.380649e-23 * 298.15 / 100e-9), rel=1e-6)
