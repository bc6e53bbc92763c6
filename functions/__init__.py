"""The arithmetic of tausheet: plain array functions that are also cell functions."""

from tausheet.functions.energy import (
    c_for_energy,
    dissipated,
    energy_c,
    energy_l,
    i2t,
    ride_through,
)
from tausheet.functions.parts import preferred, rkm, rkm_text
from tausheet.functions.response import step
from tausheet.functions.service import reason, version
from tausheet.functions.tolerance import corners, draw
from tausheet.functions.units import in_unit, si, text

__all__ = [
    "c_for_energy",
    "corners",
    "dissipated",
    "draw",
    "energy_c",
    "energy_l",
    "i2t",
    "in_unit",
    "preferred",
    "reason",
    "ride_through",
    "rkm",
    "rkm_text",
    "si",
    "step",
    "text",
    "version",
]
