"""What was solved before is taken again only for the same question."""

from __future__ import annotations

import pytest
from boardkit import edif

from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.analysis.study import Memory, analyse

PARTS = [
    ("U1", "", {"1": "IN"}),
    ("C1", "1uF|TECHNOLOGY=film|VOLTAGE=63V", {"1": "IN", "2": "OUT"}),
    ("R1", "10k|TOLERANCE=1%", {"1": "OUT", "2": "GND"}),
]


def settling(within: str, memory: Memory) -> float:
    brief = (
        '[[pin]]\nat = "U1.1"\ndrives = "2 V"\n'
        f'[[coupling]]\nname = "c"\nfrom = "IN"\nto = "OUT"\nsettle = {{ within = {within} }}\n'
    )
    study = analyse(BoardFiles(ExportFiles(edif(PARTS), "b.edn", {}), brief.encode(), "b.brief.toml"), memory=memory)
    check = study.check("coupling:c:settling")
    assert check is not None
    assert check.nominal is not None
    return check.nominal


def test_a_share_is_not_taken_for_a_voltage_of_the_same_number() -> None:
    """5 % of a 2 V start is 0.1 V, reached ln 2 time constants before 0.05 V (R C = 10 ms)."""
    memory = Memory()
    share, volts = settling('"5 %"', memory), settling('"50 mV"', memory)
    assert volts - share == pytest.approx(10e-3 * 0.6931471805599453, rel=1e-4)
