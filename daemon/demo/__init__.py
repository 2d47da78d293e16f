"""A board to try the program on, a greenhouse data logger, and the saves of its story. All data invented."""

from reactance.daemon.demo.saves import FILE as FILE
from reactance.daemon.demo.saves import STEM as STEM
from reactance.daemon.demo.saves import Save as Save
from reactance.daemon.demo.saves import saves as saves
