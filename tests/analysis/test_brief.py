"""The brief: what it may hold, and one message with table, key and line for what it may not."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from reactance.analysis.brief import read_brief
from reactance.analysis.design import InputError

WHOLE = """
[board]
title = "probe"
ground = ["GND", "AGND"]
temperature = { low = "-20 degC", high = "60 degC" }
service_life = "5 years"
mounting_inductance = "0.5 nH"
movement = "5 %"
derating = { ceramic = 0.6 }
parts = ["../parts.toml"]

[[rail]]
net = "+3V3"
voltage = "3.3 V"
tolerance = "2 %"
source = { resistance = "20 mohm", inductance = "30 nH" }
step = { current = "0.8 A", rise = "10 ns" }
allowed = "5 %"
allowed_rhythm = "165 mV"
band = { low = "1 kHz", high = "35 MHz" }
bypass = 1.0

[[pin]]
at = ["U3.5", "U3.6"]
drives = "2.5 V"
resistance = 50
toward = "GND"
capacitance = "5 pF"
bias_current = "20 nA"
greatest_voltage = "3.6 V"
least_voltage = "-0.3 V"

[[coupling]]
name = "line in"
from = "LINE_IN"
to = "AMP_IN"
lowest_frequency = "20 Hz"
loss = "0.5 dB"
settle = { within = "10 mV", time = "500 ms" }
tilt = { pulse = "10 ms", most = "5 %" }
rejection = "40 dB"

[[filter]]
from = "SENSE_RAW"
to = "ADC_IN0"
corner = "1k6"
tolerance = "10 %"
corner_high = { least = "1 kHz", most = "2 kHz" }
attenuation = [ { at = "100 kHz", least = "35 dB" } ]
passband = { from = "10 Hz", to = "500 Hz", ripple = "0.5 dB" }
step = { overshoot = "5 %", settle = "2 ms" }

[[part]]
match = { refdes = "C1*" }
esr = "5 mohm"

[[amplifier]]
plus = "U1.3"
minus = "U1.2"
out = "U1.1"

[[duty]]
capacitor = "C7"
is = "timing"

[attributes]
rated_voltage = ["VMAX"]
"""


def test_every_key_is_read_in_si() -> None:
    tables = read_brief(WHOLE.encode(), "b.toml").tables
    assert tables.board.service_life == 5 * 8766 * 3600
    assert tables.board.temperature is not None
    assert (tables.board.temperature.low, tables.board.temperature.high) == (-20.0, 60.0)
    assert tables.board.derating == {"ceramic": 0.6}
    rail = tables.rail[0]
    assert rail.source is not None
    assert rail.step is not None
    assert rail.allowed is not None
    assert (rail.source.resistance, rail.source.inductance) == (0.02, 30e-9)
    assert (rail.step.current, rail.step.rise) == (0.8, 10e-9)
    assert rail.allowed.volts(3.3) == pytest.approx(0.165)
    assert rail.allowed_rhythm is not None
    assert rail.allowed_rhythm.volts(3.3) == 0.165
    assert tables.pin[0].places == ("U3.5", "U3.6")
    assert tables.pin[0].resistance == 50.0
    assert tables.coupling[0].from_ == "LINE_IN"
    assert tables.filter[0].corner == 1600.0
    assert tables.filter[0].attenuation[0].least == 35.0
    assert tables.amplifier[0].open_loop_gain == 100.0
    assert tables.duty[0].is_ == "timing"
    assert tables.part[0]["esr"] == "5 mohm"


def test_no_brief_gives_the_defaults() -> None:
    brief = read_brief(None, "none")
    assert not brief.present
    assert brief.tables.board.service_life == 1000 * 3600
    assert brief.tables.board.mounting_inductance == 0.5e-9
    assert brief.tables.board.movement == 0.05


BAD = {
    "unknown table": ("[bored]\ntitle = 'x'\n", "bored", 1),
    "unknown key": ("[board]\ntitel = 'x'\n", "[board], titel", 2),
    "unknown key in the second table": ("[[rail]]\nnet='A'\n[[rail]]\nnet='B'\nvolts=3\n", "[[rail]] 2, volts", 5),
    "wrong unit": ("[[rail]]\nnet = 'A'\nvoltage = '3 ohm'\n", "[[rail]] 1, voltage", 3),
    "missing key": ("[[rail]]\nvoltage = '3 V'\n", "[[rail]] 1, net", 1),
    "wrong kind": ("[[rail]]\nnet = 3\n", "[[rail]] 1, net", 2),
    "truth value as quantity": ("[[rail]]\nnet = 'A'\nvoltage = true\n", "[[rail]] 1, voltage", 3),
    "nested": ("[[rail]]\nnet='A'\nstep = { current = '1 A', rise = '3 V' }\n", "[[rail]] 1, step.rise", 3),
    "single table": ("[rail]\nnet = 'A'\n", "[rail]", 1),
    "unknown duty": ("[[duty]]\ncapacitor = 'C1'\nis = 'ballast'\n", "[[duty]] 1, is", 3),
    "order of temperatures": ("[board]\ntemperature = { low = '60 degC', high = 0 }\n", "[board], temperature", 2),
    "two tables of a rail": ("[[rail]]\nnet='A'\n[[rail]]\nnet='A'\n", "[[rail]] 2, net", 4),
    "negative": ("[[rail]]\nnet='A'\ntolerance = '-2 %'\n", "[[rail]] 1, tolerance", 3),
    "empty band": ("[[rail]]\nnet='A'\nband = { low = '2 MHz', high = '1 MHz' }\n", "[[rail]] 1, band", 3),
    "share of nothing": ("[[rail]]\nnet='A'\nallowed = '5 %'\n", "[[rail]] 1, allowed", 3),
    "loss without frequency": ("[[coupling]]\nfrom='A'\nto='B'\nloss='1 dB'\n", "[[coupling]] 1, loss", 4),
    "same name twice": ("[[filter]]\nfrom='A'\nto='B'\n[[filter]]\nfrom='A'\nto='B'\n", "[[filter]] 2, name", 4),
    "broken": ("[board\n", "TOML", 1),
    "unquoted": ("[board]\ntitle = x\n", "TOML", 2),
    "zero corner": ("[[filter]]\nfrom='A'\nto='B'\ncorner = 0\n", "[[filter]] 1, corner", 4),
}


@pytest.mark.parametrize("text,where,line", BAD.values(), ids=BAD.keys())
def test_one_message_with_table_key_and_line(text: str, where: str, line: int) -> None:
    with pytest.raises(InputError) as caught:
        read_brief(text.encode(), "probe.brief.toml")
    said = str(caught.value)
    assert said.startswith(f"probe.brief.toml:{line}")
    assert where in said
    assert "\n" not in said


def test_not_utf8() -> None:
    with pytest.raises(InputError, match=r"b.toml:2: the brief is not UTF-8"):
        read_brief(b"[board]\ntitle = '\xff'\n", "b.toml")


@given(st.text(max_size=200))
def test_any_text_is_read_or_refused_with_a_message(text: str) -> None:
    try:
        read_brief(text.encode("utf-8", "surrogatepass"), "b.toml")
    except InputError as problem:
        assert problem.place.file == "b.toml"


@given(st.integers(0, len(WHOLE) - 1), st.sampled_from(["", "=", "[", '"', "{", "\n", "x", "-1", "'5 V'"]))
def test_a_damaged_brief_is_read_or_refused_with_a_message(at: int, put: str) -> None:
    text = WHOLE[:at] + put + WHOLE[at + 1 :]
    try:
        read_brief(text.encode(), "b.toml")
    except InputError as problem:
        assert problem.place.file == "b.toml"
