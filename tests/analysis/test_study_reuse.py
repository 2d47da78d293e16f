"""What was solved before is used again only where it answers the same question."""

from __future__ import annotations

from boardkit import edif

from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.analysis.study import Memory, analyse

PARTS = [
    ("U1", "", {"1": "SRC"}),
    ("C1", "1uF|DIELECTRIC=C0G|VOLTAGE=16V", {"1": "SRC", "2": "OUT"}),
    ("R1", "100k", {"1": "OUT", "2": "GND"}),
]


def test_a_share_and_a_voltage_of_the_same_number_are_two_questions() -> None:
    memory = Memory()

    def settling(within: str) -> float | None:
        brief = f'[[pin]]\nat = "U1.1"\ndrives = "2.5 V"\n[[coupling]]\nfrom = "SRC"\nto = "OUT"\n' \
            f'settle = {{ within = "{within}", time = "1 s" }}\n'  # fmt: skip
        files = BoardFiles(ExportFiles(edif(PARTS), "b.edn", {}), brief.encode(), "b.brief.toml")
        check = analyse(files, memory=memory).check("coupling:SRC>OUT:settling")
        assert check is not None
        return check.nominal

    share, volts = settling("5 %"), settling("50 mV")
    assert share is not None and volts is not None and volts > share * 1.2  # ln(2.5/0.05) over ln(1/0.05)
