"""How much ripple is left on an averaged square drive, into R-C or R-L?

In both circuits the voltage of the load follows the drive times k = R_load / (R_ser + R_load) with
one time constant: (R_ser || R_load) C_out with the load across a capacitor, L_out / (R_ser +
R_load) with the load in series with an inductor. So one set of formulas serves both.
"""

from __future__ import annotations

from tausheet.templates.model import (
    COUNT,
    Basis,
    Block,
    Caution,
    Check,
    Choice,
    Curve,
    Demo,
    Group,
    Hazard,
    Heading,
    Input,
    Level,
    Picture,
    Quantity,
    Rule,
    Sense,
    Sheet,
    Tolerance,
    Trace,
    Varies,
    WorstCase,
)

RC = 'circuit="R-C"'
RL = 'circuit="R-L"'


def _limit(
    symbol: str, description: str, current: bool, value: str, source: str, rule: Rule | None = None
) -> Input:
    low = 0.0 if symbol.endswith("_pp") else -1e5
    return Input(
        symbol,
        description,
        "current" if current else "voltage",
        ("A", "mA", "kA") if current else ("V", "mV", "kV"),
        low,
        1e5,
        "no such load is driven beyond this",
        Demo(value, source),
        rules=(rule,) if rule else (),
        needed=RL if current else RC,
    )


DRIVE = Group(
    "Square drive",
    (
        Input(
            "V_low",
            "lower level of the drive",
            "voltage",
            ("V", "mV", "kV"),
            -20e3,
            20e3,
            "no switched drive has such a level",
            Demo("0 V", "output stage of the controller", "0 V", "0.05 V"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "V_high",
            "upper level of the drive",
            "voltage",
            ("V", "mV", "kV"),
            -20e3,
            20e3,
            "no switched drive has such a level",
            Demo("10 V", "output stage of the controller", "9.9 V", "10.1 V"),
            Tolerance.ABSOLUTE,
            (
                Rule(
                    "V_high_lo>V_low_hi",
                    "is not above V_low in every case: the levels must not meet",
                ),
            ),
        ),
        Input(
            "f_sw",
            "switching frequency",
            "frequency",
            ("kHz", "Hz", "MHz"),
            1e-3,
            1e8,
            "a drive that is averaged switches between these",
            Demo("5 kHz", "timer of the controller", "-2 %", "2 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "d_on",
            "duty: share of the period at the upper level",
            "ratio",
            ("%",),
            0.0,
            1.0,
            "a share lies from 0 to 100 %",
            Demo("50 %", "speed reference, lowest to highest speed", "10 %", "90 %"),
            Tolerance.ABSOLUTE,
        ),
        Choice(
            "reverse",
            "current may flow back into the drive (no: a diode blocks it)",
            ("yes", "no"),
            Demo("yes", "push-pull output stage"),
        ),
    ),
)

NETWORK = Group(
    "Averaging circuit and load",
    (
        Choice(
            "circuit",
            "load across a capacitor (R-C), or in series with an inductor (R-L)",
            ("R-C", "R-L"),
            Demo("R-C", "schematic of the speed reference"),
        ),
        Input(
            "R_ser",
            "series resistance, that of the coil included",
            "resistance",
            ("kohm", "ohm", "mohm", "Mohm"),
            1e-6,
            1e9,
            "no series resistance lies outside this",
            Demo("10 kohm", "resistor data sheet, with temperature", "-1 %", "1 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "C_out",
            "capacitance across the load",
            "capacitance",
            ("uF", "nF", "pF", "mF"),
            1e-13,
            10.0,
            "no averaging capacitor lies outside this",
            Demo("1 uF", "film capacitor data sheet, with ageing", "-10 %", "10 %"),
            Tolerance.PERCENT,
            needed=RC,
        ),
        Input(
            "L_out",
            "inductance in series with the load",
            "inductance",
            ("mH", "H", "uH"),
            1e-9,
            1e3,
            "no averaging inductor lies outside this",
            Demo("", ""),
            Tolerance.PERCENT,
            needed=RL,
        ),
        Input(
            "R_load",
            "resistance of the load",
            "resistance",
            ("Mohm", "kohm", "ohm", "mohm"),
            1e-6,
            1e12,
            "an open output is entered as its leakage, at most 1 Tohm",
            Demo("1 Mohm", "input of the drive's controller", "-20 %", "20 %"),
            Tolerance.PERCENT,
        ),
    ),
)

LIMITS = Group(
    "What the load stands",
    (
        _limit("V_top", "R-C: highest load voltage allowed", False, "9.5 V", "input of the drive"),
        _limit(
            "V_bottom",
            "R-C: lowest load voltage allowed",
            False,
            "0.5 V",
            "input of the drive, above its dead band",
            Rule("V_bottom<V_top", "is not below V_top: the band must have a width"),
        ),
        _limit("V_pp", "R-C: peak-to-peak allowed", False, "100 mV", "speed steadiness, 1 %"),
        _limit("I_top", "R-L: highest load current allowed", True, "", ""),
        _limit(
            "I_bottom",
            "R-L: lowest load current allowed",
            True,
            "",
            "",
            Rule("I_bottom<I_top", "is not below I_top: the band must have a width"),
        ),
        _limit("I_pp", "R-L: peak-to-peak allowed", True, "", ""),
        Input(
            "k_loss",
            "loss of the mean under load allowed",
            "ratio",
            ("%",),
            0.0,
            1.0,
            "a share lies from 0 to 100 %",
            Demo("2 %", "accuracy of the speed reference"),
        ),
        Input(
            "s_ok",
            "remainder at which the mean counts as settled",
            "ratio",
            ("%",),
            1e-9,
            0.99,
            "a step is settled with a remainder between these",
            Demo("1 %", "accuracy of the speed reference"),
        ),
        Input(
            "t_ok",
            "settling time allowed",
            "time",
            ("ms", "s", "us"),
            1e-9,
            1e6,
            "nobody waits longer",
            Demo("100 ms", "ramp generator of the drive"),
        ),
    ),
)

_RATIO = "R_load/(R_ser+R_load)"
_TAU_RC = "R_ser*R_load/(R_ser+R_load)*C_out"
_TAU_RL = "L_out/(R_ser+R_load)"


def _settled(what: str) -> str:
    """The settled response of either circuit, written in inputs."""
    levels = f"{_RATIO}*V_low,{_RATIO}*V_high,1/f_sw,d_on"
    return (
        f'IF({RC},conduct*FO_RIPPLE({_TAU_RC},{levels},"{what}"),'
        f'conduct*FO_RIPPLE({_TAU_RL},{levels},"{what}"))'
    )


_K_LO, _K_HI = "R_load_lo/(R_ser_hi+R_load_lo)", "R_load_hi/(R_ser_lo+R_load_hi)"
_R_LO, _R_HI = "(R_ser_lo+R_load_lo)", "(R_ser_hi+R_load_hi)"
_SHARE = (
    f'IF({RC},conduct*FO_RIPPLE({_TAU_RC},{_RATIO}*V_low,{_RATIO}*V_high,1/f_sw,d_on,"pp")/V_pp,'
    f'conduct*FO_RIPPLE({_TAU_RL},V_low,V_high,1/f_sw,d_on,"pp")/(R_ser+R_load)/I_pp)'
)
_PERIODS = "/(f_sw_lo*tau_lo_hand)"
_LOST = f"(1-EXP(-1{_PERIODS}))"
_LOST_ON, _LOST_OFF = f"(1-EXP(-d_on_hi{_PERIODS}))", f"(1-EXP(-(1-d_on_hi){_PERIODS}))"
_LEFT_ON, _LEFT_OFF = f"(1-EXP(-d_on_lo{_PERIODS}))", f"(1-EXP(-(1-d_on_lo){_PERIODS}))"

CONDUCTION = Block(
    "Does the current keep its direction?",
    (
        Quantity(
            "tau_lo",
            "shortest time constant",
            f"IF({RC},FO_TAU_RC(R_ser_lo*R_load_lo/(R_ser_lo+R_load_lo),C_out_lo),"
            "FO_TAU_RL(R_ser_hi+R_load_hi,L_out_lo))",
            "time",
            "tau, every part at the extreme that makes it short",
            f"IF({RC},C_out_lo/(1/R_ser_lo+1/R_load_lo),L_out_lo/(R_ser_hi+R_load_hi))",
        ),
        Quantity(
            "I_least",
            "lowest current out of the drive",
            f"IF({RC},(V_low_lo-R_load_hi/(R_ser_lo+R_load_hi)*FO_RIPPLE(tau_lo,V_low_lo,V_high_hi,"
            '1/f_sw_lo,d_on_hi,"max"))/R_ser_lo,FO_RIPPLE(tau_lo,V_low_lo,V_high_lo,1/f_sw_lo,'
            'd_on_lo,"min")/(R_ser_hi+R_load_hi))',
            "current",
            "R-C: (V_low - highest V) / R_ser; R-L: the lowest load current; at the shortest tau, "
            "the lowest frequency and the duty that makes it least",
            f"IF({RC},(V_low_lo-R_load_hi/(R_ser_lo+R_load_hi)*(V_high_hi*{_LOST_ON}+V_low_lo"
            f"*(1-{_LOST_ON})*{_LOST_OFF})/{_LOST})/R_ser_lo,(V_low_lo*{_LEFT_OFF}+V_high_lo*(1"
            f"-{_LEFT_OFF})*{_LEFT_ON})/{_LOST}/(R_ser_hi+R_load_hi))",
        ),
        Quantity(
            "conduct",
            "1 while conduction is continuous",
            'IF(OR(reverse="yes",I_least>=0),1,NA())',
            COUNT,
            "no result where a diode stops the current: the formulas below do not hold then",
            'IF(OR(reverse="yes",I_least_hand>=0),1,NA())',
        ),
    ),
)

SETTLED = Block(
    "Settled response at the load, nominal",
    (
        Quantity(
            "k_div",
            "share of the drive that reaches the load",
            _RATIO,
            "ratio",
            "k_div = R_load / (R_ser + R_load)",
        ),
        Quantity(
            "tau",
            "time constant",
            f"IF({RC},FO_TAU_RC(R_ser*R_load/(R_ser+R_load),C_out),FO_TAU_RL(R_ser+R_load,L_out))",
            "time",
            "R-C: tau = (R_ser || R_load) C_out; R-L: tau = L_out / (R_ser + R_load)",
            f"IF({RC},C_out/(1/R_ser+1/R_load),{_TAU_RL})",
        ),
        Quantity(
            "V_max",
            "highest load voltage",
            _settled("max"),
            "voltage",
            "V_max = k (V_high (1 - a) + V_low a (1 - b)) / (1 - a b), a = exp(-d / (f tau)), "
            "b = exp(-(1 - d) / (f tau))",
            "conduct_hand*k_div*(V_high*(1-EXP(-d_on/(f_sw*tau_hand)))+V_low*EXP(-d_on/(f_sw"
            "*tau_hand))*(1-EXP(-(1-d_on)/(f_sw*tau_hand))))/(1-EXP(-1/(f_sw*tau_hand)))",
        ),
        Quantity(
            "V_min",
            "lowest load voltage",
            _settled("min"),
            "voltage",
            "V_min = k (V_low (1 - b) + V_high b (1 - a)) / (1 - a b)",
            "conduct_hand*k_div*(V_low*(1-EXP(-(1-d_on)/(f_sw*tau_hand)))+V_high*EXP(-(1-d_on)"
            "/(f_sw*tau_hand))*(1-EXP(-d_on/(f_sw*tau_hand))))/(1-EXP(-1/(f_sw*tau_hand)))",
        ),
        Quantity(
            "V_rip",
            "peak-to-peak of the load voltage",
            _settled("pp"),
            "voltage",
            "V_rip = k (V_high - V_low) (1 - a) (1 - b) / (1 - a b)",
            "conduct_hand*k_div*(V_high-V_low)*(1-EXP(-d_on/(f_sw*tau_hand)))*(1-EXP(-(1-d_on)"
            "/(f_sw*tau_hand)))/(1-EXP(-1/(f_sw*tau_hand)))",
        ),
        Quantity(
            "k_pp",
            "peak-to-peak as a share of what is allowed",
            _SHARE,
            "ratio",
            "R-C: V_rip / V_pp; R-L: V_rip / (R_load I_pp)",
            f"IF({RC},V_rip_hand/V_pp,V_rip_hand/R_load/I_pp)",
        ),
        Quantity(
            "V_mean",
            "mean of the load voltage",
            _settled("mean"),
            "voltage",
            "V_mean = k (d V_high + (1 - d) V_low)",
            "conduct_hand*k_div*(d_on*V_high+(1-d_on)*V_low)",
        ),
        Quantity(
            "I_mean",
            "mean of the load current",
            "V_mean/R_load",
            "current",
            "I_mean = V_mean / R_load",
        ),
        Quantity(
            "d_worst",
            "duty of the greatest ripple",
            "MIN(d_on_hi,MAX(d_on_lo,0.5))",
            "ratio",
            "50 %, or the duty of the range next to it: (1 - a)(1 - b) is greatest for a = b",
        ),
    ),
)

WORST_BLOCK = Block(
    "Worst case against what the load stands",
    (
        Quantity(
            "V_peak",
            "highest, worst case, as a voltage of the drive",
            'conduct*FO_RIPPLE(tau_lo,V_low_hi,V_high_hi,1/f_sw_lo,d_on_hi,"max")',
            "voltage",
            "V_max / k with tau and f at their lowest, d and the levels at their highest",
            f"conduct_hand*(V_high_hi*{_LOST_ON}+V_low_hi*(1-{_LOST_ON})*{_LOST_OFF})/{_LOST}",
        ),
        Quantity(
            "V_dip",
            "lowest, worst case, likewise",
            'conduct*FO_RIPPLE(tau_lo,V_low_lo,V_high_lo,1/f_sw_lo,d_on_lo,"min")',
            "voltage",
            "V_min / k with tau, f, d and the levels at their lowest",
            f"conduct_hand*(V_low_lo*{_LEFT_OFF}+V_high_lo*(1-{_LEFT_OFF})*{_LEFT_ON})/{_LOST}",
        ),
        Quantity(
            "k_top",
            "highest value, from bottom (0 %) to top (100 %) of the band",
            f"IF({RC},(MAX(V_peak*{_K_LO},V_peak*{_K_HI})-V_bottom)/(V_top-V_bottom),"
            f"(MAX(V_peak/{_R_LO},V_peak/{_R_HI})-I_bottom)/(I_top-I_bottom))",
            "ratio",
            "R-C: load voltage k V_peak; R-L: load current V_peak / (R_ser + R_load), each at the "
            "resistances that make it highest: on the safe side, as they set tau too",
        ),
        Quantity(
            "k_bottom",
            "lowest value, likewise",
            f"IF({RC},(MIN(V_dip*{_K_LO},V_dip*{_K_HI})-V_bottom)/(V_top-V_bottom),"
            f"(MIN(V_dip/{_R_LO},V_dip/{_R_HI})-I_bottom)/(I_top-I_bottom))",
            "ratio",
            "R-C: load voltage k V_dip; R-L: load current V_dip / (R_ser + R_load)",
        ),
        Quantity(
            "k_swing",
            "peak-to-peak as a share of what is allowed, worst case",
            "k_pp_max*(V_high_hi-V_low_lo)/(V_high-V_low)",
            "ratio",
            "worst case of part 6, with the levels of the drive farthest apart",
        ),
        Quantity(
            "k_drop",
            "loss of the mean under load, highest",
            "R_ser_hi/(R_ser_hi+R_load_lo)",
            "ratio",
            "k_drop = 1 - k, R_ser at its highest and R_load at its lowest",
            "1-R_load_lo/(R_ser_hi+R_load_lo)",
        ),
        Quantity(
            "tau_hi",
            "longest time constant",
            f"IF({RC},FO_TAU_RC(R_ser_hi*R_load_hi/(R_ser_hi+R_load_hi),C_out_hi),"
            "FO_TAU_RL(R_ser_lo+R_load_lo,L_out_hi))",
            "time",
            "tau, every part at the extreme that makes it long",
        ),
        Quantity(
            "t_set",
            "settling time of the mean, longest",
            "conduct*FO_SETTLING_TIME(tau_hi,s_ok)",
            "time",
            "t_set = tau_hi ln(1 / s_ok)",
            f"conduct_hand*IF({RC},C_out_hi/(1/R_ser_hi+1/R_load_hi),L_out_hi/(R_ser_lo"
            "+R_load_lo))*LN(1/s_ok)",
        ),
    ),
)


WORST = WorstCase(
    "k_pp",
    _SHARE,
    (
        *(Varies(part) for part in ("R_ser", "R_load", "C_out", "L_out", "f_sw")),
        Varies("d_on", "0.5"),
    ),
    draws=100,
)

CHECKS = (
    Check(
        "top",
        "Highest value within the band",
        "k_top",
        "1",
        "ratio",
        "What the load stands; levels of the drive at their highest",
    ),
    Check(
        "bottom",
        "Lowest value within the band",
        "k_bottom",
        "0",
        "ratio",
        "What the load stands; levels of the drive at their lowest",
        Sense.AT_LEAST,
    ),
    Check(
        "ripple",
        "Peak-to-peak",
        "k_swing",
        "1",
        "ratio",
        "Share of what is allowed, at duty {d_worst} and the lowest frequency",
    ),
    Check(
        "mean",
        "Loss of the mean under load",
        "k_drop",
        "k_loss",
        "ratio",
        "Accuracy asked of the mean",
    ),
    Check(
        "settling",
        "Settling time of the mean",
        "t_set",
        "t_ok",
        "time",
        "Remainder {s_ok}, at the longest time constant",
    ),
)

HAZARDS = (
    Hazard(
        "Current that cannot reverse",
        'AND(reverse="no",I_least<0)',
        "The current out of the drive would fall to {I_least}, but cannot reverse: conduction "
        "stops being continuous, the formulas do not hold, and no result is given.",
    ),
    Hazard(
        "Close to losing conduction",
        'AND(reverse="no",I_least>=0,I_least<0.1*MAX(ABS(V_high_hi),ABS(V_low_lo))/(R_ser+R_load))',
        "The current falls to {I_least} within each period: a little less load and conduction "
        "stops.",
    ),
    Hazard(
        "Worst duty inside the range",
        "AND(d_on_lo<0.5,d_on_hi>0.5)",
        "The ripple is greatest at {d_worst} duty, not at an end of the range.",
    ),
    Hazard(
        "Hardly averaged",
        "tau_lo*f_sw_lo<1",
        "A period is longer than the shortest time constant, {tau_lo}: the load follows the drive "
        "rather than its mean.",
    ),
)

_START = 'k_div*FO_RIPPLE(tau_lo,V_low,V_high_hi,1/f_sw_lo,d_worst,"min")'

_ALLOWED = f"IF({RC},V_pp,I_pp*R_load)"
_MIDDLE = "k_div*(d_worst*V_high_hi+(1-d_worst)*V_low)"

CURVE = Curve(
    end="2.4/f_sw_lo",
    time_unit="ms",
    quantity="voltage",
    unit="V",
    y_title="load voltage",
    caption="Settled; a period begins at 0, and before it the end of the last one is held. "
    "Greatest ripple: shortest time constant, lowest frequency, duty nearest to 50 %; the lines "
    "lie about its mean, not about the nominal one.",
    traces=(
        Trace(
            "greatest ripple",
            f"FO_SQUARE(t,tau_lo,{_START},k_div*V_low,k_div*V_high_hi,1/f_sw_lo,d_worst)",
        ),
        Trace(
            "nominal",
            "FO_SQUARE(t,tau,V_min,k_div*V_low,k_div*V_high,1/f_sw,d_on)",
        ),
    ),
    levels=(
        Level("ripple allowed, upper", f"{_MIDDLE}+{_ALLOWED}/2"),
        Level("ripple allowed, lower", f"{_MIDDLE}-{_ALLOWED}/2"),
    ),
    points=240,
    from_zero=False,
)

CAUTIONS = (
    Caution(
        "An inductor drives on",
        "An inductor keeps its current when a wire or a switch opens, and raises any voltage that "
        "this takes. Give the current a path before anything is disconnected.",
    ),
    Caution(
        "A capacitor stays charged",
        "The averaging capacitor keeps its voltage after the drive is off. Discharge and measure "
        "it before touching; one at a dangerous voltage has a calc sheet of its own (bleed).",
    ),
    Caution(
        "Ripple current heats",
        "Capacitor and coil carry the ripple as heat. Compare its r.m.s. value with their ratings; "
        "this sheet does not.",
    ),
    Caution(
        "A reference that fails",
        "A stuck drive puts its upper level on the load for good. Where that is dangerous, a limit "
        "that does not depend on it must act.",
    ),
)

BASIS = Basis(
    method=(
        "Settled response of one time constant to a square: between two switchings y heads for k "
        "V_high or k V_low; that it ends a period where it began gives both extremes in closed "
        "form.",
        "Worst case over every corner of resistances, storage and frequency, with the duty at both "
        "ends of its range and at 50 % where that lies inside; the levels of the drive at the "
        "extremes that make each check hardest.",
    ),
    assumptions=(
        "Levels and edges are ideal: edges short against the period, levels independent of load.",
        "Parts are linear, and the load is a resistance.",
        "R-L: load current and load voltage are proportional; leakage and core loss are left out.",
    ),
    sources=(
        "Closed form of the settled response to a square, tested against step-by-step switching.",
        "A diode that blocks: continuous conduction only while the lowest current is not negative "
        "(common practice).",
    ),
    not_covered=(
        "Discontinuous conduction, second-order filters, resistance of the capacitor (ESR), "
        "saturation, dead time, jitter, radiated noise.",
    ),
)

SHEET = Sheet(
    name="ripple",
    title="Ripple of an averaged square drive",
    question="how much ripple is left on an averaged square drive, into R-C or R-L?",
    purpose="To show that the load sees the mean of a switched drive, with its ripple, extremes "
    "and settling time within what it stands.",
    picture=Picture(
        "ripple.png",
        "The drive switches between V_low and V_high, d_on of each period at V_high. R-C on the "
        "left, R-L on the right: the circuit picked above is the one that is calculated.",
    ),
    groups=(DRIVE, NETWORK, LIMITS),
    blocks=(CONDUCTION, SETTLED, WORST_BLOCK),
    worst_cases=(WORST,),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-007",
        "Hoist drive: speed reference",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
)
"""The calc sheet."""
