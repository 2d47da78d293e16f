"""The demonstration board: a greenhouse data logger. The board, its parts and their numbers are invented.

A battery feeds +5V through a switching regulator; +3V3 and +1V8 come from linear regulators, and +3V3A for the
analogue half through a ferrite bead. Four soil probes go through equal filters into a converter. A microphone
for bats passes two bias points and an anti-alias filter into the same converter.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from reactance.daemon.demo.parts import (
    BATTERY_CONNECTOR,
    BEAD,
    BUCK,
    BUTTON,
    CLIMATE_SENSOR,
    CONTROLLER,
    CONVERTER,
    CRYSTAL,
    DEBUG_CONNECTOR,
    DIODE,
    DUAL_AMPLIFIER,
    FLASH,
    FUSE,
    INDUCTOR,
    LINEAR,
    MICROPHONE,
    PROBE_CONNECTOR,
    RADIO,
    Placed,
    capacitor,
    other,
    polarised,
    resistor,
)

PROBES = 4
CHANNEL_PORTS = ("PROBE", "ADC", "GND")


@dataclass(frozen=True)
class LoggerBoard:
    """The whole schematic: parts of the top sheet, and parts of the probe channel, a cell that is used four times."""

    parts: tuple[Placed, ...]
    channel: tuple[Placed, ...]

    def without(self, refdes: str) -> LoggerBoard:
        """The board with one part of the top sheet taken off."""
        self._find(self.parts, refdes)
        return replace(self, parts=tuple(part for part in self.parts if part.refdes != refdes))

    def changed(self, refdes: str, properties: Mapping[str, str]) -> LoggerBoard:
        """The board with properties of one part of the top sheet rewritten."""
        return replace(self, parts=_changed(self.parts, self._find(self.parts, refdes), properties))

    def channel_changed(self, refdes: str, properties: Mapping[str, str]) -> LoggerBoard:
        """The board with properties of one part of the probe channel rewritten, and so in all four channels."""
        return replace(self, channel=_changed(self.channel, self._find(self.channel, refdes), properties))

    @staticmethod
    def _find(parts: tuple[Placed, ...], refdes: str) -> Placed:
        return next(part for part in parts if part.refdes == refdes)


def _changed(parts: tuple[Placed, ...], one: Placed, properties: Mapping[str, str]) -> tuple[Placed, ...]:
    return tuple(part.changed(properties) if part is one else part for part in parts)


def first_board() -> LoggerBoard:
    """The board as it was first exported."""
    parts = (*_battery(), *_linear_supplies(), *_controller(), *_digital(), *_converter(), *_microphone())
    return LoggerBoard(parts, _channel())


def _battery() -> tuple[Placed, ...]:
    """Battery input and the switching regulator for +5V."""
    return (
        other("J1", BATTERY_CONNECTOR, "battery, 2 pins", "BAT_IN GND", FOOTPRINT="GLCON2"),
        other("F1", FUSE, "1 A", "BAT_IN VBAT", FOOTPRINT="1206"),
        other("D1", DIODE, "12 V suppressor", "VBAT GND", FOOTPRINT="GLD2"),
        capacitor("C1", "10uF 25V X7R 1206", "VBAT"),
        polarised("C2", "100uF 16V aluminium GLCAN8", "VBAT"),
        other("U1", BUCK, "GL5101", "VBAT GND SW BST FB BUCK_EN", PART_NUMBER="GL5101-6"),
        capacitor("C3", "100nF 25V X7R 0402", "BST", "SW"),
        other("L1", INDUCTOR, "10uH", "SW +5V", TOLERANCE="20%", FOOTPRINT="GLIND6", DCR="45 mohm"),
        resistor("R1", "49k9", "+5V", "FB"),
        resistor("R2", "9k53", "FB", "GND"),
        capacitor("C4", "22pF 50V C0G 0402", "+5V", "FB"),
        resistor("R3", "100k", "VBAT", "BUCK_EN"),
        resistor("R4", "10R", "SW", "SNUB"),
        capacitor("C5", "470pF 50V C0G 0603", "SNUB"),
        capacitor("C6", "22uF 10V X5R 0805", "+5V"),
        capacitor("C7", "22uF 10V X5R 0805", "+5V"),
        polarised("C8", "47uF 10V polymer GLPOL3528", "+5V"),
        capacitor("C9", "100nF 25V X7R 0402", "+5V"),
    )


def _linear_supplies() -> tuple[Placed, ...]:
    """+3V3, +1V8, and the analogue +3V3A behind its bead."""
    return (
        other("U2", LINEAR, "GL3300", "+5V GND +5V - +3V3", PART_NUMBER="GL3300-5"),
        capacitor("C10", "1uF 25V X7R 0603", "+5V"),
        capacitor("C11", "10uF 10V X7R 0805", "+3V3"),
        other("U3", LINEAR, "GL1800", "+3V3 GND +3V3 - +1V8", PART_NUMBER="GL1800-5"),
        capacitor("C12", "1uF 16V X7R 0603", "+3V3"),
        capacitor("C13", "2.2uF 10V X7R 0603", "+1V8"),
        other("FB1", BEAD, "600R@100MHz", "+3V3 +3V3A", TOLERANCE="25%", FOOTPRINT="0603", DCR="250 mohm"),
        capacitor("C14", "4.7uF 10V X7R 0805", "+3V3A"),
        capacitor("C15", "100nF 16V X7R 0402", "+3V3A"),
    )


def _controller() -> tuple[Placed, ...]:
    """The controller with its decoupling, crystal, reset and debug connector."""
    nets = (
        "+3V3 +3V3 +3V3 +3V3 +1V8 +1V8 GND GND GND GND XIN XOUT RESET_N SPI_SCK SPI_MOSI SPI_MISO "
        "CS_ADC CS_FLASH CS_RADIO SDA SCL LED_ON DEBUG_CLK DEBUG_DATA"
    )
    return (
        other("U4", CONTROLLER, "GL32M", nets, PART_NUMBER="GL32M-24"),
        *(capacitor(f"C{n}", "100nF 16V X7R 0402", "+3V3") for n in (16, 17, 18, 19)),
        capacitor("C20", "1uF 16V X7R 0603", "+3V3"),
        capacitor("C21", "100nF 16V X7R 0402", "+1V8"),
        capacitor("C22", "100nF 16V X7R 0402", "+1V8"),
        capacitor("C23", "2.2uF 10V X7R 0603", "+1V8"),
        other("Y1", CRYSTAL, "12MHz", "XIN XOUT", FOOTPRINT="GLX32"),
        capacitor("C24", "18pF 50V C0G 0402", "XIN"),
        capacitor("C25", "18pF 50V C0G 0402", "XOUT"),
        resistor("R5", "1M", "XIN", "XOUT"),
        resistor("R6", "10k", "+3V3", "RESET_N"),
        capacitor("C26", "100nF 16V X7R 0402", "RESET_N"),
        other("SW1", BUTTON, "reset", "RESET_N GND", FOOTPRINT="GLSW4"),
        other("J3", DEBUG_CONNECTOR, "debug, 5 pins", "+3V3 GND DEBUG_CLK DEBUG_DATA RESET_N", FOOTPRINT="GLCON5"),
    )


def _digital() -> tuple[Placed, ...]:
    """Flash memory, radio, climate sensor and the lamp."""
    return (
        other("U6", FLASH, "GL25F", "CS_FLASH SPI_MISO +3V3 GND SPI_MOSI SPI_SCK +3V3 +3V3", PART_NUMBER="GL25F-64"),
        capacitor("C27", "100nF 16V X7R 0402", "+3V3"),
        other("U7", RADIO, "GL868", "+3V3 +3V3 GND GND SPI_SCK SPI_MOSI SPI_MISO CS_RADIO", PART_NUMBER="GL868-M"),
        capacitor("C28", "2.2uF 10V X7R 0603", "+3V3"),
        capacitor("C29", "100nF 16V X7R 0402", "+3V3"),
        other("U9", CLIMATE_SENSOR, "GLRH4", "SDA GND +3V3 SCL", PART_NUMBER="GLRH4"),
        capacitor("C31", "100nF 16V X7R 0402", "+3V3"),
        resistor("R7", "4k7", "+3V3", "SDA"),
        resistor("R8", "4k7", "+3V3", "SCL"),
        resistor("R9", "1k", "LED_ON", "LED_A"),
        other("D2", DIODE, "green", "GND LED_A", FOOTPRINT="0603"),
    )


def _converter() -> tuple[Placed, ...]:
    """The converter with its reference, and the connector of the soil probes."""
    nets = (
        "+3V3A +3V3 GND GND VREF ADC_SOIL1 ADC_SOIL2 ADC_SOIL3 ADC_SOIL4 ADC_BAT - SPI_SCK SPI_MOSI SPI_MISO CS_ADC"
    )
    return (
        other("U5", CONVERTER, "GL16A", nets, PART_NUMBER="GL16A-15"),
        capacitor("C32", "100nF 16V X7R 0402", "+3V3A"),
        capacitor("C33", "100nF 16V X7R 0402", "+3V3"),
        capacitor("C34", "1uF 16V X7R 0603", "VREF"),
        capacitor("C35", "100nF 16V X7R 0402", "VREF"),
        other(
            "J2", PROBE_CONNECTOR, "soil probes, 6 pins", "+5V GND SOIL1_RAW SOIL2_RAW SOIL3_RAW SOIL4_RAW",
            FOOTPRINT="GLCON6",
        ),
    )  # fmt: skip


def _microphone() -> tuple[Placed, ...]:
    """The microphone, its preamplifier between two bias points, and the anti-alias filter."""
    return (
        resistor("R10", "47R", "+3V3A", "MIC_VDD"),
        capacitor("C36", "1uF 16V X7R 0603", "MIC_VDD"),
        other("MK1", MICROPHONE, "GLBAT1", "MIC_VDD GND MIC_OUT", PART_NUMBER="GLBAT1"),
        capacitor("C40", "2.2nF 50V C0G 0603", "MIC_OUT", "PRE_IN"),
        resistor("R11", "100k", "+3V3A", "PRE_IN"),
        resistor("R12", "100k", "PRE_IN", "GND"),
        other("U8", DUAL_AMPLIFIER, "GL2020", "PRE_OUT PRE_FB PRE_IN GND AA_MID2 AA_OUT AA_OUT +3V3A",
              PART_NUMBER="GL2020-8"),
        capacitor("C48", "100nF 16V X7R 0402", "+3V3A"),
        resistor("R13", "10k", "PRE_OUT", "PRE_FB"),
        capacitor("C42", "10pF 50V C0G 0402", "PRE_OUT", "PRE_FB"),
        resistor("R14", "1k", "PRE_FB", "PRE_LEG"),
        capacitor("C41", "100nF 16V X7R 0603", "PRE_LEG"),
        capacitor("C43", "6.8nF 50V X7R 0402", "PRE_OUT", "AA_IN"),
        resistor("R15", "47k", "VREF", "AA_IN"),
        resistor("R16", "47k", "AA_IN", "GND"),
        resistor("R17", "3k3", "AA_IN", "AA_MID1"),
        resistor("R18", "3k3", "AA_MID1", "AA_MID2"),
        capacitor("C44", "470pF 50V C0G 0603", "AA_MID1", "AA_OUT"),
        capacitor("C45", "220pF 50V C0G 0603", "AA_MID2"),
        resistor("R19", "100R", "AA_OUT", "ADC_BAT"),
        capacitor("C46", "330pF 50V C0G 0402", "ADC_BAT"),
        capacitor("C47", "100pF 50V C0G 0402", "ADC_BAT").changed({"FITTED": "DNP"}),
    )  # fmt: skip


def _channel() -> tuple[Placed, ...]:
    """One soil-probe channel: a first RC against radio pick-up, a second that sets the corner."""
    return (
        resistor("R1", "2k2", "PROBE", "RF"),
        capacitor("C1", "10nF 50V C0G 0603", "RF"),
        resistor("R2", "22k", "RF", "ADC"),
        capacitor("C2", "220nF 25V C0G 1206", "ADC"),
        resistor("R3", "1M", "PROBE", "GND"),
    )
