"""Does a measured transient agree with the design time constant?

A step response is fitted to the points of a record inside a window after switching; the result is
put right for the probe and compared with the design tolerance, less a guard band as wide as the
expanded uncertainty.
"""

from __future__ import annotations

import math
import random

from tausheet.templates.model import (
    COUNT,
    NUMBER,
    Basis,
    Block,
    Caution,
    Check,
    Choice,
    Curve,
    Demo,
    EntryTable,
    Formed,
    Group,
    Hazard,
    Heading,
    Input,
    Level,
    ListColumn,
    Listing,
    Moment,
    NumberColumn,
    Picture,
    Quantity,
    Rule,
    Sense,
    Sheet,
    Tolerance,
    Trace,
)

POINTS = 10_000
SLICES = 12
SHOWN = 100
KNOWN = 'start="known"'
ACROSS_C, ON_SHUNT = "R-C, probe across C", "R-L, probe across a shunt"
TIMES = ("ms", "s", "us", "min", "h")


def _record() -> tuple[tuple[str, str], ...]:
    """The demo's record, invented: 24 V step, 10.3 ms, noise, read to 20 mV by an oscilloscope."""
    noise = random.Random(4)
    points = []
    for number in range(-50, 550):
        time = number / 10
        value = 24 * (1 - math.exp(-max(time, 0.0) / 10.3)) + noise.gauss(0, 0.04)
        points.append((f"{time:.1f} ms", f"{round(value / 0.02) * 0.02:.2f} V"))
    return tuple(points)


MEASURED = EntryTable(
    "measured",
    "Measured points",
    (
        NumberColumn("time", "time", "time", TIMES, -1e7, 1e7, "no record lasts longer"),
        NumberColumn(
            "value", "voltage", "voltage", ("V", "mV", "kV"),
            -1e6, 1e6, "no record of a voltage lies outside this",
        ),
    ),
    POINTS,
    _record(),
    "oscilloscope record of the limit-switch input, invented for the demo job",
    rules=(Rule("here_time>above_time", "times must rise from row to row: sort the points"),),
    least=10,
    worksheet="Measured",
)  # fmt: skip


def _moment(symbol: str, what: str, demo: Demo, *rules: Rule) -> Input:
    return Input(
        symbol, what, "time", TIMES, -1e7, 1e7, "no record lasts longer", demo, rules=rules
    )


RECORD = Group(
    "The record",
    (
        _moment("t_switch", "moment of switching, in the time of the record",
                Demo("0 ms", "trigger of the oscilloscope on the switch")),
        _moment("t_from", "first moment to use", Demo("0.5 ms", "after the edge, by eye"),
                Rule("t_from>=t_switch", "lies before t_switch: points before switching are no "
                     "part of the response and must not be fitted"),
                Rule("t_from<t_to", "is not before t_to")),
        _moment("t_to", "last moment to use", Demo("50 ms", "record is flat from here on")),
        Choice("start", "voltage at the moment of switching",
               ("fitted", "known"), Demo("fitted", "offset of the oscilloscope is not known well")),
        Input("V_0", "voltage at t_switch, where it is known", "voltage", ("V", "mV", "kV"),
              -1e6, 1e6, "no record of a voltage lies outside this", Demo("", ""), needed=KNOWN),
    ),
)  # fmt: skip

DESIGN = Group(
    "The design",
    (
        Input("tau_design", "time constant of the design, with what is allowed", "time",
              TIMES, 1e-12, 1e7, "a time constant is a time above 0",
              Demo("10 ms", "Q4-CAL-005, limit-switch filter", "8.5 ms", "11.5 ms"),
              Tolerance.ABSOLUTE),
        Choice("probed", "what the probe is on", (ACROSS_C, ON_SHUNT),
               Demo(ACROSS_C, "test set-up")),
        Input("R_node", "resistance that the capacitor sees (or that of the shunt)", "resistance",
              ("kohm", "ohm", "mohm", "Mohm"), 1e-6, 1e12, "a path has some resistance",
              Demo("10 kohm", "Q4-CAL-005, limit-switch filter")),
    ),
)  # fmt: skip


def _standard(symbol: str, what: str, demo: Demo) -> Input:
    return Input(symbol, what, "ratio", ("%",), 0.0, 0.5,
                 "an instrument this uncertain measures nothing", demo)  # fmt: skip


INSTRUMENT = Group(
    "The instrument",
    (
        _standard("u_base", "standard uncertainty of its time base",
                  Demo("0.01 %", "oscilloscope data sheet, limit / square root of 3")),
        _standard("u_lin", "standard uncertainty of tau by amplitude errors (linearity)",
                  Demo("0.5 %", "oscilloscope data sheet, common practice")),
        Input("k_cov", "coverage factor", NUMBER, (), 1.0, 4.0,
              "2 covers about 95 %, 3 about 99.7 %", Demo("2", "test plan of the drive retrofit")),
        Input("t_rise", "rise time of instrument and probe (10 % to 90 %)", "time",
              ("ns", "us", "ms", "s"), 0.0, 1e3, "a slower instrument records no transient",
              Demo("35 ns", "10 MHz bandwidth limit: 0.35 / f")),
        Input("R_probe", "resistance of the probe", "resistance", ("Mohm", "kohm", "Gohm"),
              1e2, 1e15, "no probe lies outside this", Demo("10 Mohm", "10 : 1 probe data sheet")),
        Input("C_probe", "capacitance of probe and cable", "capacitance", ("pF", "nF"),
              0.0, 1e-6, "no probe lies outside this", Demo("15 pF", "10 : 1 probe data sheet")),
        _standard("u_probe", "standard uncertainty of the correction for the probe, of it",
                  Demo("20 %", "common practice")),
    ),
)  # fmt: skip


def _fit(what: str, start: str = "t_from", end: str = "t_to") -> str:
    known = f'FO_FIT_FROM(measured_time,measured_value,t_switch,V_0,"{what}",{start},{end})'
    free = f'FO_FIT(measured_time,measured_value,"{what}",{start},{end})'
    return f"IF({KNOWN},{known},{free})"


FIT = Block(
    "Fit",
    (
        Quantity("n_before", "points before switching, left out",
                 "SUMPRODUCT((measured_time<t_switch)*1)", COUNT, "earlier than t_switch"),
        Quantity("n_low", "points before the window", "SUMPRODUCT((measured_time<t_from)*1)", COUNT,
                 "earlier than t_from"),
        Quantity("n_used", "points used",
                 "SUMPRODUCT((measured_time>=t_from)*(measured_time<=t_to))", COUNT,
                 "from t_from to t_to",
                 "SUMPRODUCT((measured_time<=t_to)*1)-SUMPRODUCT((measured_time<t_from)*1)"),
        Quantity("tau_fit", "time constant of the record", _fit("tau"), "time",
                 "least squares of V = V_end + (V_first - V_end) exp(-(t - t_first) / tau)"),
        Quantity("u_fit", "its standard error", _fit("tau error"), "time",
                 "from the residuals and the Jacobian"),
        Quantity("V_end", "final voltage", _fit("final"), "voltage", "fitted"),
        Quantity("t_first", "moment to which the first voltage belongs",
 f"IF({KNOWN},t_switch,INDEX(measured_time,n_low+1))", "time",
                 "t_switch where the voltage there is known, else the first moment used"),
        Quantity("V_first", "voltage there",
                 f'IF({KNOWN},V_0,FO_FIT(measured_time,measured_value,"initial",t_from,t_to))',
                 "voltage", "known, or fitted"),
        Quantity("V_switch", "voltage at t_switch, by the curve",
                 "V_end+(V_first-V_end)*EXP((t_first-t_switch)/tau_fit)", "voltage",
                 "the curve carried back to t_switch"),
        Quantity("V_res", "residual standard deviation", _fit("residual"), "voltage",
                 "of the points about the curve"),
        Quantity("q_span", "length of the window in time constants", "(t_to-t_from)/tau_fit",
                 NUMBER, "(t_to - t_from) / tau_fit"),
    ),
)  # fmt: skip

PROBE = Block(
    "Probe",
    (
        Quantity("tau_seen", "what the probe makes of the design",
                 f'IF(probed="{ACROSS_C}",FO_TAU_RC(R_node*R_probe/(R_node+R_probe),'
                 "tau_design/R_node+C_probe),tau_design)", "time",
                 "R_node parallel to R_probe, times the capacitance with C_probe added; a shunt is "
                 "not loaded",
                 f'IF(probed="{ACROSS_C}",(tau_design+R_node*C_probe)/(1+R_node/R_probe),'
                 "tau_design)"),
        Quantity("tau_true", "time constant without the probe",
                 f'IF(probed="{ACROSS_C}",tau_fit*(1+R_node/R_probe)-R_node*C_probe,tau_fit)',
                 "time", "tau_fit (1 + R_node / R_probe) - R_node C_probe"),
        Quantity("d_probe", "correction", "tau_true-tau_fit", "time", "tau_true - tau_fit"),
    ),
)  # fmt: skip

UNCERTAINTY = Block(
    "Uncertainty and guard band",
    (
        Quantity("u_tau", "combined standard uncertainty",
                 "SQRT((u_fit*(1+R_node/R_probe))^2+(tau_true*u_base)^2+(tau_true*u_lin)^2"
                 "+(d_probe*u_probe)^2)", "time",
                 "root of the sum of squares: fit, time base, amplitude, probe"),
        Quantity("w_guard", "expanded uncertainty, taken as guard band", "k_cov*u_tau", "time",
                 "U = k_cov u"),
        Quantity("tau_up", "with the guard band above", "tau_true+w_guard", "time", "tau_true + U"),
        Quantity("tau_down", "with the guard band below", "tau_true-w_guard", "time",
                 "tau_true - U"),
        Quantity("w_share", "guard band, of half the tolerance",
                 "w_guard/((tau_design_hi-tau_design_lo)/2)", "ratio",
                 "1 leaves nothing to accept; a third is common practice"),
    ),
)  # fmt: skip

PATTERN = Block(
    "Pattern of the residuals",
    (
        Quantity("tau_early", "time constant of the early part",
                 _fit("tau", end="MIN(t_to,t_from+2*tau_fit)"), "time",
                 "the fit again, from t_from over two time constants"),
        Quantity("u_early", "its standard error",
                 _fit("tau error", end="MIN(t_to,t_from+2*tau_fit)"), "time", "the same"),
        Quantity("tau_late", "time constant of the late part",
                 'FO_FIT(measured_time,measured_value,"tau",t_from+tau_fit,t_to)', "time",
                 "the fit again, from one time constant after t_from on, its start fitted"),
        Quantity("u_late", "its standard error",
                 'FO_FIT(measured_time,measured_value,"tau error",t_from+tau_fit,t_to)', "time",
                 "the same"),
        Quantity("d_tau", "difference of the two", "ABS(tau_early-tau_late)", "time",
                 "a single exponential has the same time constant everywhere"),
        Quantity("d_most", "difference that chance and instrument explain",
                 "3*SQRT(u_early^2+u_late^2)+k_cov*tau_fit*SQRT(u_base^2+u_lin^2)", "time",
                 "three standard errors of the difference, and the instrument"),
    ),
)  # fmt: skip


def _slice(number: int) -> tuple[str, ...]:
    """A point of the window: what was measured there, and the curve."""
    return (
        f"INDEX(measured_time,n_low+1+INT(n_used*{2 * number - 1}/{2 * SLICES}))",
        f"INDEX(measured_value,n_low+1+INT(n_used*{2 * number - 1}/{2 * SLICES}))",
        "V_end+(V_first-V_end)*EXP(-(here_time-t_first)/tau_fit)",
        "(here_value-here_curve)/V_res",
    )


def _some(number: int) -> tuple[str, ...]:
    """One of the points that the curve shows, evenly taken from the record."""
    row = f"1+INT(MAX(0,measured_count-1)*{number}/{SHOWN - 1})"
    return (f"INDEX(measured_time,{row})", f"INDEX(measured_value,{row})")


FORMED = (
    Formed(
        "slice",
        ("time", "value", "curve", "off"),
        tuple(_slice(number) for number in range(1, SLICES + 1)),
    ),
    Formed("some", ("time", "value"), tuple(_some(number) for number in range(SHOWN))),
)

CHECKS = (
    Check("upper", "Time constant with guard band, above", "tau_up", "tau_design_hi", "time",
          "Highest allowed by the design; accepted only inside it by the guard band"),
    Check("lower", "Time constant with guard band, below", "tau_down", "tau_design_lo", "time",
          "Lowest allowed by the design; accepted only inside it by the guard band",
          Sense.AT_LEAST),
    Check("pattern", "Early and late time constant differ", "d_tau", "d_most", "time",
          "Points before switching, a second time constant, drift or a limit shows here"),
    Check("window", "Length of the window in time constants", "q_span", "3", NUMBER,
          "Less shows too little of the final value; common practice", Sense.AT_LEAST),
)  # fmt: skip

HAZARDS = (
    Hazard("No fit", "ISERROR(tau_fit)",
           "The points show no single time constant: look for points before switching, a window "
           "with more than one switching, or a flat record. The reason stands in part 5."),
    Hazard("Edge inside the window", "t_from<t_switch+2*t_rise",
           "The window begins while the instrument itself is still rising: begin it later."),
    Hazard("Probe loads the circuit", "ABS(tau_seen/tau_design-1)>0.01",
           "The probe turns the design value into {tau_seen}. The correction rests on R_node, "
           "R_probe and C_probe: use a lighter probe."),
    Hazard("Slow instrument", "t_rise>tau_fit/5",
           "The rise time of the instrument is not short against the time constant."),
    Hazard("Few points", "n_used<30",
           "Only {n_used} points are used: their standard error is itself uncertain."),
    Hazard("Uncertain measurement", "w_share>1/3",
           "The guard band takes {w_share} of half the tolerance: a good part may be rejected."),
)  # fmt: skip

CURVE = Curve(
    end="(t_to-t_switch)/1.25",
    time_unit="ms",
    quantity="voltage",
    unit="V",
    y_title="voltage of the record",
    caption=f"Time from t_switch on. The record is shown by {SHOWN} of its points, spread evenly; "
    "the fit uses all from t_from to t_to.",
    traces=(
        Trace("measured", "INDEX(some_value,MAX(1,SUMPRODUCT((some_time<=t+t_switch)*1)))"),
        Trace("fitted", "IF(t<0,V_switch,V_end+(V_switch-V_end)*EXP(-t/tau_fit))"),
        Trace("design", "IF(t<0,V_switch,V_end+(V_switch-V_end)*EXP(-t/tau_seen))"),
    ),
    levels=(Level("final", "V_end"),),
    moments=(Moment("window begins", "t_from-t_switch"), Moment("window ends", "t_to-t_switch")),
    points=100,
    from_zero=False,
)  # fmt: skip

CAUTIONS = (
    Caution("Measuring on live equipment",
            "Use probes, leads and instruments rated for the voltage and the overvoltage category "
            "of the place. An earthed oscilloscope on a live circuit is a short circuit: use a "
            "differential probe or an isolated instrument."),
    Caution("The circuit is charged while you connect",
            "Connect and remove the probe with the equipment isolated, discharged and proved dead. "
            "Triggering the transient is a switching operation: nobody else may be near."),
    Caution("A pass is about this one unit",
            "The record shows one unit at one temperature. It says nothing of ageing, of the next "
            "unit, or of a failure to come."),
    Caution("Discharge is not proved by a record",
            "A record of a falling voltage shows that the resistors work now. It never replaces "
            "proving dead before touching."),
)  # fmt: skip

BASIS = Basis(
    method=(
        "V = V_end + (V_first - V_end) exp(-(t - t_first) / tau), fitted by least squares to the "
        "points from t_from to t_to; V_first fitted too, or known at t_switch. No result where the "
        "residuals are plainly not random (runs test) or the points cannot tell.",
        "The loading of the probe is taken out by calculation. Guard band: the tolerance of the "
        "design is narrowed at both ends by the expanded uncertainty (simple acceptance inside).",
    ),
    assumptions=(
        "One time constant, errors of the points independent and of equal size, exact times.",
        "Errors of offset and gain of the instrument do not change tau; errors of linearity do, "
        "and are entered as u_lin.",
        "A shunt is not loaded by the probe. The probe's values have the uncertainty u_probe.",
    ),
    sources=(
        "Fit: variable projection, checked against NIST StRD (Misra1a, BoxBOD).",
        "Uncertainty: JCGM 100; guard band: JCGM 106, ISO 14253-1 (from memory; confirm against "
        "the edition in force). Window of three time constants, three standard errors, 3 to 1: "
        "common practice.",
    ),
    not_covered=(
        "Records with several time constants, periodic records, time-base drift, aliasing, common-"
        "mode errors of differential probes, and correlated noise such as mains hum, which makes "
        "the standard error too small.",
    ),
)

_OFF = "INDEX(slice_off,here_row)"
LISTING = Listing(
    "residuals",
    "Residuals at twelve moments of the window, in residual standard deviations",
    (
        ListColumn("time", "time", "INDEX(slice_time,here_row)", "time"),
        ListColumn("value", "measured", "INDEX(slice_value,here_row)", "voltage", 2),
        ListColumn("curve", "fitted", "INDEX(slice_curve,here_row)", "voltage", 2),
        ListColumn(
            "off",
            "residual",
            f'FO_TEXT(ABS({_OFF}),"1",2)&IF({_OFF}>0," above"," below")',
            span=3,
        ),
    ),
    SLICES,
    "ISNUMBER(INDEX(slice_off,here_row))",
)  # fmt: skip

SHEET = Sheet(
    name="acceptance",
    title="Measured time constant",
    question="does a measured transient agree with the design time constant?",
    purpose="To show whether the time constant of a measured transient agrees with the design, "
    "with the uncertainty of the fit, the instrument and the probe taken into account.",
    picture=Picture(
        "acceptance.png",
        "The circuit is switched at t_switch. The probe, R_probe and C_probe, lies across the "
        "capacitor that sees R_node; of an R-L circuit it lies across a shunt, whose voltage is "
        "entered for the current.",
    ),
    groups=(RECORD, DESIGN, INSTRUMENT),
    blocks=(FIT, PROBE, UNCERTAINTY, PATTERN),
    worst_cases=(),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-013",
        "Limit-switch input: measured filter",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
    formed=FORMED,
    filled_in=(MEASURED,),
    listings=(LISTING,),
)
"""The calc sheet."""
