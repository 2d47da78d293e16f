"""Circuits alike but for names are solved once and still speak of their own parts and rails."""

from __future__ import annotations

import pytest
from boardkit import edif

from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.analysis.report import Check
from reactance.analysis.study import Memory, analyse


def channel(letter: str, resistance: str = "10k") -> list[tuple[str, str, dict[str, str]]]:
    return [
        (f"U{letter}", "", {"1": f"RAW_{letter}"}),
        (f"R{letter}1", f"{resistance}|TOLERANCE=1%", {"1": f"RAW_{letter}", "2": f"OUT_{letter}"}),
        (f"R{letter}2", "47k|TOLERANCE=1%", {"1": f"OUT_{letter}", "2": "+3V3"}),
        (f"C{letter}1", "10nF|DIELECTRIC=C0G|VOLTAGE=50V", {"1": f"OUT_{letter}", "2": "GND"}),
        (f"C{letter}2", "1uF|DIELECTRIC=X7R|VOLTAGE=10V|PACKAGE=0603", {"1": f"OUT_{letter}", "2": f"FAR_{letter}"}),
        (f"R{letter}3", "100k|TOLERANCE=1%", {"1": f"FAR_{letter}", "2": "GND"}),
    ]


def brief(letters: str) -> str:
    return "".join(
        f'[[filter]]\nname = "low {x}"\nfrom = "RAW_{x}"\nto = "OUT_{x}"\ncorner = "2 kHz"\n'
        f'[[coupling]]\nname = "far {x}"\nfrom = "OUT_{x}"\nto = "FAR_{x}"\n'
        f'settle = {{ within = "10 mV" }}\n[[pin]]\nat = "U{x}.1"\ndrives = "1 V"\nresistance = "50 ohm"\n'
        for x in letters
    )


def checks(letters: str, memory: Memory | None = None, second: str = "10k") -> dict[str, Check]:
    parts = [row for letter in letters for row in channel(letter, second if letter == "2" else "10k")]
    files = BoardFiles(ExportFiles(edif(parts), "b.edn", {}), brief(letters).encode(), "b.brief.toml")
    study = analyse(files, memory=memory)
    return {c.id: c for c in study.report.checks if c.id.startswith(("filter:", "coupling:"))}


def test_a_shared_solution_reads_as_the_channels_own() -> None:
    together, alone = checks("12"), checks("2")
    own = {key: check for key, check in together.items() if " 2:" in key}
    assert own.keys() == alone.keys()
    for key, check in own.items():
        other = alone[key]
        assert (check.status, check.limit, check.explain) == (other.status, other.limit, other.explain)
        assert check.nominal == pytest.approx(other.nominal, rel=1e-8)
    assert len(own) >= 10
    assert any("R21" in check.explain for check in own.values())
    assert not any("R1" in check.explain or "C1" in check.explain for check in own.values())


def test_equal_channels_are_solved_once_and_unequal_ones_are_not() -> None:
    one, two, other = Memory(), Memory(), Memory()
    checks("1", one)
    checks("12", two)
    checks("12", other, second="12k")
    assert two.solved.computed - one.solved.computed < other.solved.computed - one.solved.computed


def test_another_value_gives_another_figure() -> None:
    found = checks("12", second="12k")
    corner = "filter:low {}:corner_high"
    assert found[corner.format("1")].nominal > found[corner.format("2")].nominal


def supplies(numbers: str) -> tuple[Memory, dict[str, Check]]:
    parts, text = [], ""
    for n in numbers:
        parts += [
            (f"C{n}01", "10uF|DIELECTRIC=X5R|VOLTAGE=10V|PACKAGE=0603", {"1": f"+3V3_{n}", "2": "GND"}),
            (f"C{n}02", "100nF|DIELECTRIC=X7R|VOLTAGE=16V|PACKAGE=0402", {"1": f"+3V3_{n}", "2": "GND"}),
        ]
        text += (
            f'[[rail]]\nnet = "+3V3_{n}"\nvoltage = "3.3 V"\n'
            'source = { resistance = "20 mohm", inductance = "30 nH" }\n'
            'step = { current = "0.4 A", rise = "20 ns" }\nallowed = "5 %"\n'
        )
    memory = Memory()
    files = BoardFiles(ExportFiles(edif(parts), "b.edn", {}), text.encode(), "b.brief.toml")
    found = analyse(files, memory=memory).report.checks
    return memory, {check.id: check for check in found if check.id.startswith("rail:")}


def test_equal_rails_are_solved_once_and_name_their_own_capacitors() -> None:
    (one, alone), (two, together) = supplies("2"), supplies("12")
    assert two.solved.computed == one.solved.computed
    droop = together["rail:+3V3_2:droop"]
    assert droop.explain == alone["rail:+3V3_2:droop"].explain
    assert "C201" in droop.explain
    assert droop.nominal == pytest.approx(alone["rail:+3V3_2:droop"].nominal, rel=1e-8)
