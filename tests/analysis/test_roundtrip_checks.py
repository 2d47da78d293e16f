"""The same board in every format and habit has the same checks: ids, figures and verdicts."""

from __future__ import annotations

from functools import cache

import pytest
from writers.designs import logger_board
from writers.formats import WRITERS

from reactance.analysis.files import BoardFiles
from reactance.analysis.report import Check
from reactance.analysis.study import analyse

BRIEF = b"""
[board]
title = "greenhouse logger"

[[rail]]
net = "+3V3"
voltage = "3.3 V"

[[rail]]
net = "+3V3A"
voltage = "3.3 V"

[[rail]]
net = "VBAT"
voltage = "4.5 V"

[[filter]]
name = "soil 1"
from = "J1.1"
to = "SOIL1"
corner = "1.6 kHz"
tolerance = "60 %"

[[filter]]
name = "soil 2, inner"
from = "PROBES/PROBE2/RAW"
to = "PROBES/PROBE2/MIDDLE"

[[pin]]
at = "MK1.1"
drives = "1.2 V"
resistance = "1 kohm"

[[amplifier]]
plus = "U3.4"
minus = "U3.2"
out = "U3.1"

[[coupling]]
name = "bats"
from = "MIC"
to = "BIASED"
lowest_frequency = "15 kHz"
loss = "0.5 dB"
"""

FIRST = next(iter(WRITERS))


@cache
def checks(writer: str) -> dict[str, Check]:
    """The checks of the board as that writer writes it, by id."""
    files = BoardFiles(WRITERS[writer](logger_board()), BRIEF, "board.brief.toml")
    return {check.id: check for check in analyse(files).report.checks}


def test_the_board_has_checks_of_every_kind() -> None:
    measured = {check_id for check_id, check in checks(FIRST).items() if check.nominal is not None}
    assert len(measured) > 60
    for check_id in ("rail:+3V3A:capacitance", "filter:soil 1:corner_high", "coupling:bats:loss", "part:C12:stress"):
        assert check_id in measured


@pytest.mark.parametrize("writer", list(WRITERS)[1:])
def test_every_format_and_habit_gives_the_same_checks(writer: str) -> None:
    assert checks(writer).keys() == checks(FIRST).keys()
    for check_id, check in checks(FIRST).items():
        other = checks(writer)[check_id]
        assert (other.status, other.unit, other.limit) == (check.status, check.unit, check.limit), check_id
        # Parts come in another order, and sums with them: the last digits may differ.
        for figure in ("nominal", "low", "high", "margin"):
            expected = getattr(check, figure)
            near = None if expected is None else pytest.approx(expected, rel=1e-6, abs=1e-12)
            assert getattr(other, figure) == near, f"{check_id} {figure}"
