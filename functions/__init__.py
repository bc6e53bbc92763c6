"""The arithmetic of tausheet: plain array functions that are also cell functions."""

from tausheet.functions.crossing import crossing, stays_within
from tausheet.functions.crossing_stages import stages_crossing
from tausheet.functions.crossing_table import table_crossing
from tausheet.functions.energy import (
    c_for_energy,
    dissipated,
    energy_c,
    energy_l,
    i2t,
    ride_through,
)
from tausheet.functions.extremes import Peak, peak
from tausheet.functions.fault import dc_offset, dc_worst, fault_current, fault_i2t, peak_factor
from tausheet.functions.fit import Fit, FitFrom, fit, fit_from
from tausheet.functions.frequency import corner_frequency, gain_db, noise_bandwidth, phase, tau_at
from tausheet.functions.integrals import mean, rms
from tausheet.functions.network import Equivalent, FirstOrder, equivalent, network
from tausheet.functions.network_energy import network_energy
from tausheet.functions.network_response import network_at, network_crossing, network_peak
from tausheet.functions.overload import trip_time
from tausheet.functions.parts import preferred, rkm, rkm_text
from tausheet.functions.periodic import Ripple, ripple
from tausheet.functions.response import decay, natural, pulse, ramp, sine, square, step
from tausheet.functions.service import reason, version
from tausheet.functions.sources import rate, superpose
from tausheet.functions.stages import stages
from tausheet.functions.step_times import (
    rise_time,
    settling_time,
    time_to,
    time_until_above,
    time_until_below,
)
from tausheet.functions.table import table
from tausheet.functions.time_constants import (
    parallel,
    resistance_at,
    tau_for,
    tau_rc,
    tau_rl,
    tau_rx,
)
from tausheet.functions.tolerance import corners, draw
from tausheet.functions.units import in_unit, si, text

__all__ = [
    "Equivalent",
    "FirstOrder",
    "Fit",
    "FitFrom",
    "Peak",
    "Ripple",
    "c_for_energy",
    "corner_frequency",
    "corners",
    "crossing",
    "dc_offset",
    "dc_worst",
    "decay",
    "dissipated",
    "draw",
    "energy_c",
    "energy_l",
    "equivalent",
    "fault_current",
    "fault_i2t",
    "fit",
    "fit_from",
    "gain_db",
    "i2t",
    "in_unit",
    "mean",
    "natural",
    "network",
    "network_at",
    "network_crossing",
    "network_energy",
    "network_peak",
    "noise_bandwidth",
    "parallel",
    "peak",
    "peak_factor",
    "phase",
    "preferred",
    "pulse",
    "ramp",
    "rate",
    "reason",
    "resistance_at",
    "ride_through",
    "ripple",
    "rise_time",
    "rkm",
    "rkm_text",
    "rms",
    "settling_time",
    "si",
    "sine",
    "square",
    "stages",
    "stages_crossing",
    "stays_within",
    "step",
    "superpose",
    "table",
    "table_crossing",
    "tau_at",
    "tau_for",
    "tau_rc",
    "tau_rl",
    "tau_rx",
    "text",
    "time_to",
    "time_until_above",
    "time_until_below",
    "trip_time",
    "version",
]
