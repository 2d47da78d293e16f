"""The kinds of part on the demonstration board: its symbols, and short ways to write down a part.

Every part number here is made up.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType


@dataclass(frozen=True, slots=True)
class Port:
    """A terminal of a symbol: its name and the pin designator it stands for."""

    name: str
    designator: str
    direction: str = "INOUT"


@dataclass(frozen=True, slots=True)
class Symbol:
    """A library cell; `prefix` is the class letter of its reference designators (IEEE 315)."""

    name: str
    prefix: str
    ports: tuple[Port, ...]


@dataclass(frozen=True, slots=True)
class Placed:
    """One part: its symbol, a net for each of the symbol's ports ("" for none), and its properties."""

    refdes: str
    symbol: Symbol
    nets: tuple[str, ...]
    properties: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))

    def changed(self, properties: Mapping[str, str]) -> Placed:
        """The same part in the same place with some properties rewritten."""
        return Placed(self.refdes, self.symbol, self.nets, MappingProxyType({**self.properties, **properties}))


def symbol(name: str, prefix: str, ports: str) -> Symbol:
    """A symbol from its port names, in the order of the pin designators 1, 2, 3 …; `>` marks outputs, `<` inputs."""
    marks = {">": "OUTPUT", "<": "INPUT"}
    return Symbol(
        name,
        prefix,
        tuple(
            Port(text.lstrip("<>"), str(number), marks.get(text[0], "INOUT"))
            for number, text in enumerate(ports.split(), 1)
        ),
    )


CAPACITOR = symbol("CAPACITOR", "C", "A B")
POLAR_CAPACITOR = symbol("POLAR_CAPACITOR", "C", "P N")
RESISTOR = symbol("RESISTOR", "R", "A B")
INDUCTOR = symbol("INDUCTOR", "L", "A B")
BEAD = symbol("BEAD", "FB", "A B")
FUSE = symbol("FUSE", "F", "A B")
DIODE = symbol("DIODE", "D", "K A")
CRYSTAL = symbol("CRYSTAL", "Y", "A B")
BUTTON = symbol("BUTTON", "SW", "A B")
MICROPHONE = symbol("MICROPHONE", "MK", "<VDD GND >OUT")
BATTERY_CONNECTOR = symbol("BATTERY_CONNECTOR", "J", "BAT GND")
PROBE_CONNECTOR = symbol("PROBE_CONNECTOR", "J", "SUPPLY GND PROBE1 PROBE2 PROBE3 PROBE4")
DEBUG_CONNECTOR = symbol("DEBUG_CONNECTOR", "J", "VREF GND CLK DATA RESET_N")
BUCK = symbol("BUCK_REGULATOR", "U", "<VIN GND >SW BST <FB <EN")
LINEAR = symbol("LINEAR_REGULATOR", "U", "<IN GND <EN NC >OUT")
CONTROLLER = symbol(
    "CONTROLLER",
    "U",
    "<VDD1 <VDD2 <VDD3 <VDD4 <VCORE1 <VCORE2 GND1 GND2 GND3 GND4 <XIN >XOUT <RESET_N >SCK >MOSI <MISO "
    ">CS_ADC >CS_FLASH >CS_RADIO SDA SCL >LED CLK DATA",
)
CONVERTER = symbol(
    "CONVERTER", "U", "<AVDD <DVDD AGND DGND REF <AIN0 <AIN1 <AIN2 <AIN3 <AIN4 <AIN5 <SCK <MOSI >MISO <CS"
)
FLASH = symbol("FLASH_MEMORY", "U", "<CS >MISO <WP GND <MOSI <SCK <HOLD <VCC")
RADIO = symbol("RADIO_MODULE", "U", "<VDD1 <VDD2 GND1 GND2 <SCK <MOSI >MISO <CS")
DUAL_AMPLIFIER = symbol("DUAL_AMPLIFIER", "U", ">OUTA <INA_N <INA_P GND <INB_P <INB_N >OUTB <VDD")
CLIMATE_SENSOR = symbol("CLIMATE_SENSOR", "U", "SDA GND <VDD SCL")

SYMBOLS = (
    CAPACITOR, POLAR_CAPACITOR, RESISTOR, INDUCTOR, BEAD, FUSE, DIODE, CRYSTAL, BUTTON, MICROPHONE,
    BATTERY_CONNECTOR, PROBE_CONNECTOR, DEBUG_CONNECTOR, BUCK, LINEAR, CONTROLLER, CONVERTER, FLASH, RADIO,
    DUAL_AMPLIFIER, CLIMATE_SENSOR,
)  # fmt: skip


def capacitor(refdes: str, text: str, a: str, b: str = "GND") -> Placed:
    """A ceramic capacitor; `text` such as "10uF 10V X7R 0805"."""
    value, rated, dielectric, case = text.split()
    return Placed(refdes, CAPACITOR, (a, b), MappingProxyType(ceramic(value, rated, dielectric, case)))


def ceramic(value: str, rated: str, dielectric: str, case: str) -> dict[str, str]:
    """The properties of a ceramic capacitor, with its made-up part number."""
    return {
        "VALUE": value,
        "TOLERANCE": {"C0G": "5%", "X7R": "10%", "X5R": "20%"}[dielectric],
        "VOLTAGE": rated,
        "DIELECTRIC": dielectric,
        "FOOTPRINT": case,
        "PART_NUMBER": f"GL{case}-{dielectric}-{value.upper()}-{rated}",
    }


def polarised(refdes: str, text: str, plus: str) -> Placed:
    """A polarised capacitor from `plus` to ground; `text` such as "47uF 10V polymer GLPOL7"."""
    value, rated, technology, case = text.split()
    properties = {
        "VALUE": value,
        "TOLERANCE": "20%",
        "VOLTAGE": rated,
        "TECHNOLOGY": technology,
        "FOOTPRINT": case,
        "PART_NUMBER": f"{case}-{value.upper()}-{rated}",
    }
    return Placed(refdes, POLAR_CAPACITOR, (plus, "GND"), MappingProxyType(properties))


def resistor(refdes: str, value: str, a: str, b: str) -> Placed:
    """A resistor of 1 % in an 0402 case."""
    return Placed(refdes, RESISTOR, (a, b), MappingProxyType(resistance(value)))


def resistance(value: str) -> dict[str, str]:
    """The properties of a resistor, with its made-up part number."""
    return {"VALUE": value, "TOLERANCE": "1%", "FOOTPRINT": "0402", "PART_NUMBER": f"GL0402-R-{value.upper()}"}


def other(refdes: str, kind: Symbol, value: str, nets: str, **properties: str) -> Placed:
    """Any other part; `nets` in the order of the symbol's ports, `-` where a port stays open."""
    named = tuple("" if net == "-" else net for net in nets.split())
    if len(named) != len(kind.ports):
        raise ValueError(f"{refdes}: {len(named)} nets for {len(kind.ports)} ports")
    return Placed(refdes, kind, named, MappingProxyType({"VALUE": value, **properties}))
