"""What the demonstration board must do, as the brief that lies beside its export. Every figure is invented."""

from __future__ import annotations

from reactance.daemon.demo.board import PROBES

_BOARD = """\
# What the greenhouse logger must do. The board, its parts and every figure here are invented.

[board]
title = "Greenhouse data logger"
ground = ["GND"]
temperature = { low = "-10 degC", high = "55 degC" }
service_life = "5 years"
mounting_inductance = "0.5 nH"
movement = "5 %"

# ---- supplies -----------------------------------------------------------------------------

[[rail]]                                  # two lithium cells
net = "VBAT"
voltage = "7.4 V"
tolerance = "15 %"

[[rail]]
net = "+5V"
voltage = "5 V"
tolerance = "3 %"
source = { resistance = "35 mohm", inductance = "250 nH" }
step = { current = "0.9 A", rise = "200 ns" }
allowed = "3 %"

[[rail]]                                  # the radio's burst
net = "+3V3"
voltage = "3.3 V"
tolerance = "2 %"
source = { resistance = "80 mohm", inductance = "95 nH" }
step = { current = "0.5 A", rise = "50 ns" }
allowed = "2.5 %"
bypass = 0.7

[[rail]]                                  # the controller wakes
net = "+1V8"
voltage = "1.8 V"
tolerance = "2 %"
source = { resistance = "120 mohm", inductance = "150 nH" }
step = { current = "0.2 A", rise = "20 ns" }
allowed = "5 %"
bypass = 1.0

[[rail]]                                  # analogue half, behind the bead
net = "+3V3A"
voltage = "3.3 V"
tolerance = "2 %"

[[rail]]                                  # the converter's reference
net = "VREF"
voltage = "2.5 V"
tolerance = "0.2 %"
source = { resistance = "0.5 ohm", inductance = "100 nH" }

# ---- pins ---------------------------------------------------------------------------------

[[pin]]
at = "U1.SW"                              # mean of the switched node
drives = "5 V"
resistance = "0.1 ohm"

[[pin]]
at = "U1.BST"
drives = "10 V"
resistance = "10 ohm"

[[pin]]
at = ["U4.XIN", "U4.XOUT"]
resistance = "10 Mohm"

[[pin]]
at = ["U5.AIN0", "U5.AIN1", "U5.AIN2", "U5.AIN3"]
resistance = "10 Mohm"
capacitance = "8 pF"
greatest_voltage = "3.6 V"
least_voltage = "-0.3 V"

[[pin]]
at = ["J2.PROBE1", "J2.PROBE2", "J2.PROBE3", "J2.PROBE4"]
drives = "1.2 V"
resistance = "1 kohm"

[[pin]]
at = "MK1.OUT"
drives = "0.9 V"
resistance = "350 ohm"

[[pin]]
at = "U8.INA_P"
capacitance = "5 pF"
greatest_voltage = "3.6 V"
least_voltage = "-0.3 V"

# ---- the bats -----------------------------------------------------------------------------

[[amplifier]]
plus = "U8.INA_P"
minus = "U8.INA_N"
out = "U8.OUTA"
open_loop_gain = "110 dB"
gain_bandwidth = "20 MHz"
output_resistance = "60 ohm"

[[amplifier]]
plus = "U8.INB_P"
minus = "U8.INB_N"
out = "U8.OUTB"
open_loop_gain = "110 dB"
gain_bandwidth = "20 MHz"
output_resistance = "60 ohm"

[[coupling]]
name = "bat microphone"
from = "MIC_OUT"
to = "PRE_IN"
lowest_frequency = "12 kHz"
loss = "0.3 dB"
settle = { within = "10 mV", time = "2 ms" }

[[coupling]]
name = "preamplifier"
from = "PRE_OUT"
to = "AA_IN"
lowest_frequency = "12 kHz"
loss = "0.5 dB"
settle = { within = "10 mV", time = "5 ms" }

[[filter]]
name = "anti-alias"
from = "AA_IN"
to = "AA_OUT"
corner = "150 kHz"
tolerance = "15 %"
attenuation = [ { at = "1 MHz", least = "28 dB" } ]
passband = { to = "60 kHz", ripple = "0.6 dB" }
step = { overshoot = "12 %", settle = "20 us" }
"""

_PROBE = """
[[filter]]                                # soil, slow, beside a radio
name = "soil probe {number}"
from = "SOIL{number}_RAW"
to = "ADC_SOIL{number}"
corner = "29 Hz"
tolerance = "15 %"
attenuation = [ {{ at = "1 kHz", least = "28 dB" }} ]
step = {{ settle = "40 ms" }}
"""

_PARTS = """
# ---- what is known about parts ------------------------------------------------------------

[[part]]                                  # measured on the bench for the 0805 part
match = { number = "GL0805-X7R-10UF-10V" }
bias_curve = [["0 V", 1.0], ["1.8 V", 0.95], ["3.3 V", 0.86], ["5 V", 0.71], ["10 V", 0.40]]

[[part]]
match = { number = "GL0805-X5R-22UF-10V" }
bias_curve = [["0 V", 1.0], ["2.5 V", 0.86], ["5 V", 0.58], ["10 V", 0.27]]

[[part]]
match = { number = "GL0603-X7R-2.2UF-10V" }
bias_curve = [["0 V", 1.0], ["1.8 V", 0.96], ["3.3 V", 0.87], ["5 V", 0.73], ["10 V", 0.42]]

[[part]]
match = { refdes = "C8" }
esr = "18 mohm"
"""


def brief_text() -> str:
    """The brief as TOML."""
    return _BOARD + "".join(_PROBE.format(number=number) for number in range(1, PROBES + 1)) + _PARTS
