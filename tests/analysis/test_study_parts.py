"""Checks of single parts on whole boards: arrays, large networks, margins, stored charge."""

from __future__ import annotations

import math

from boardkit import PartRow, checks_of

X7R = "|VOLTAGE=16V|DIELECTRIC=X7R|FOOTPRINT=0603"


def test_the_stress_of_an_array_is_that_of_its_worst_section() -> None:
    nets = ["+3V3", "+5V", "+12V", "+24V", "GND", "GND", "GND", "GND"]
    pins = {str(number): net for number, net in enumerate(nets, 1)}
    check = checks_of([("CN1", "100nF|VOLTAGE=16V|DESCRIPTION=CAP ARRAY 4X0402 X7R", pins)])["part:CN1:stress"]
    assert check.nominal == 24 / 16 and check.status == "fail"
    assert "pins 4 and 5" in check.explain


def test_a_section_of_unknown_voltage_makes_the_stress_of_an_array_unknown_unless_another_fails() -> None:
    def status(rail: str) -> str:
        pins = {"1": rail, "2": "FLOATING", "3": "GND", "4": "GND"}
        row = ("CN1", "100nF|VOLTAGE=16V|DESCRIPTION=CAP ARRAY 2X0402 X7R", pins)
        return checks_of([row])["part:CN1:stress"].status

    assert status("+3V3") == "unknown"
    assert status("+24V") == "fail"


def test_a_network_too_large_for_its_spread_still_has_a_nominal_stress() -> None:
    parts: list[PartRow] = [(f"R{n}", "10k", {"1": "WIDE", "2": f"END{n}"}) for n in range(650)]
    parts += [("R900", "1k", {"1": "WIDE", "2": "+3V3"}), ("C1", f"100nF{X7R}", {"1": "WIDE", "2": "GND"})]
    check = checks_of(parts)["part:C1:stress"]
    assert check.nominal is not None and math.isclose(check.nominal, 3.3 / 16)
    assert check.high is None and check.status == "marginal"
    assert "its spread is not known" in check.explain and "WIDE" in check.explain


def test_a_margin_of_nothing_has_no_sign() -> None:
    check = checks_of([("C1", f"1uF{X7R}", {"1": "+5V", "2": "GND"})])["net:GND:return"]
    assert check.margin == 0 and math.copysign(1, check.margin) == 1
