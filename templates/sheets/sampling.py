"""Does the sample capacitor settle to the converter's resolution in the acquisition time?

A source with a resistance, a stray capacitance at the converter's pin, a switch and a sample
capacitor. Two capacitors make the circuit second order; the sheet uses the sum of the open-circuit
time constants for one, which is on the safe side.
"""

from __future__ import annotations

from tausheet.templates.model import (
    COUNT,
    NUMBER,
    Basis,
    Block,
    Caution,
    Check,
    Curve,
    Demo,
    Group,
    Hazard,
    Heading,
    Input,
    Level,
    Mark,
    Moment,
    Picture,
    Quantity,
    Rule,
    Sheet,
    Tolerance,
    Trace,
    Varies,
    WorstCase,
)

SOURCE = Group(
    "Signal source and wiring",
    (
        Input(
            "R_src",
            "resistance of the source, as the pin sees it",
            "resistance",
            ("kohm", "ohm", "Mohm"),
            0.0,
            1e8,
            "a source above 100 Mohm drives no sampling input",
            Demo("1 kohm", "anti-alias resistor of the load-cell channel", "-2 %", "2 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "C_stray",
            "stray capacitance at the pin: wiring, protection, pin",
            "capacitance",
            ("pF", "nF"),
            0.0,
            1e-6,
            "more is a filter capacitor, not a stray one",
            Demo("20 pF", "layout review, converter data sheet", "12 pF", "26 pF"),
            Tolerance.ABSOLUTE,
        ),
    ),
)

CONVERTER = Group(
    "Converter",
    (
        Input(
            "R_sw",
            "resistance of the sampling switch",
            "resistance",
            ("ohm", "kohm"),
            0.0,
            1e6,
            "no sampling switch is worse",
            Demo("200 ohm", "converter data sheet, all conditions", "90 ohm", "400 ohm"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "C_samp",
            "sample capacitance",
            "capacitance",
            ("pF", "nF"),
            1e-14,
            1e-7,
            "sample capacitors lie between these",
            Demo("15 pF", "converter data sheet", "-20 %", "20 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "n_bits",
            "resolution in bits",
            COUNT,
            (),
            4,
            32,
            "converters resolve 4 to 32 bits",
            Demo("16", "converter data sheet"),
        ),
        Input(
            "V_span",
            "full-scale span of the input",
            "voltage",
            ("V", "mV"),
            1e-3,
            100.0,
            "no converter pin has another span",
            Demo("5 V", "reference of the load-cell channel"),
        ),
        Input(
            "t_acq",
            "acquisition time",
            "time",
            ("us", "ns", "ms", "s"),
            1e-10,
            10.0,
            "acquisition takes between these",
            Demo("0.75 us", "timing of the converter: 12 clocks of 16 MHz", "-1 %", "1 %"),
            Tolerance.PERCENT,
        ),
    ),
)

START = Group(
    "Where the sample capacitor starts",
    (
        Input(
            "V_begin",
            "starting error: farthest from the signal that the capacitor begins",
            "voltage",
            ("V", "mV"),
            1e-6,
            100.0,
            "it begins at most one span away, or it is damaged",
            Demo("5 V", "multiplexed: the channel before may stand at the other end"),
            rules=(
                Rule(
                    "V_begin<=2*V_span",
                    "is more than two spans: no input is driven so far",
                ),
            ),
        ),
        Input(
            "Q_kick",
            "kick-back: charge that the switch throws in as it closes",
            "charge",
            ("pC", "nC"),
            0.0,
            1e-6,
            "no sampling switch throws in more",
            Demo("2 pC", "converter data sheet, highest", "0 pC", "4 pC"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "e_ok",
            "settling error allowed, in LSB",
            NUMBER,
            (),
            1e-3,
            1000.0,
            "less is not measured, more is no settling",
            Demo("0.5", "error budget of the load-cell channel"),
        ),
    ),
)

_TAU = "FO_TAU_RC(R_src+R_sw,C_samp)+FO_TAU_RC(R_src,C_stray)"
_TAU_HI = "(R_src_hi+R_sw_hi)*C_samp_hi+R_src_hi*C_stray_hi"

SETTLING = Block(
    "Settling",
    (
        Quantity(
            "V_lsb",
            "one LSB",
            "V_span/2^n_bits",
            "voltage",
            "V_lsb = V_span / 2^n_bits",
        ),
        Quantity(
            "V_off",
            "error at the start of the acquisition, highest",
            "V_begin+Q_kick_hi/C_samp_lo",
            "voltage",
            "V_off = V_begin + Q_kick,hi / C_samp,lo: all of the kick-back taken by the sample "
            "capacitor",
        ),
        Quantity(
            "tau",
            "time constant, nominal",
            _TAU,
            "time",
            "tau = (R_src + R_sw) C_samp + R_src C_stray",
            "R_src*(C_samp+C_stray)+R_sw*C_samp",
        ),
        Quantity(
            "tau_hi",
            "time constant, worst case",
            "FO_TAU_RC(R_src_hi+R_sw_hi,C_samp_hi)+FO_TAU_RC(R_src_hi,C_stray_hi)",
            "time",
            "tau_hi: the same with every part at its highest",
        ),
        Quantity(
            "n_tau",
            "acquisition in time constants, worst case",
            "t_acq_lo/tau_hi",
            NUMBER,
            "n_tau = t_acq,lo / tau_hi",
        ),
        Quantity(
            "e_set",
            "settled error in LSB, nominal",
            "FO_NATURAL(t_acq,tau,V_off)/V_lsb",
            NUMBER,
            "e_set = V_off exp(-t_acq / tau) / V_lsb",
            "V_off*EXP(-t_acq/(R_src*(C_samp+C_stray)+R_sw*C_samp))*2^n_bits/V_span",
        ),
        Quantity(
            "t_half",
            "time to 1/2 LSB, nominal",
            "FO_TIME_UNTIL_BELOW(V_lsb/2,tau,V_off,0)",
            "time",
            "t_half = tau ln(2 V_off / V_lsb); from one span it is (n_bits + 1) ln 2 tau",
            "MAX(0,(R_src*(C_samp+C_stray)+R_sw*C_samp)*LN(2*V_off*2^n_bits/V_span))",
        ),
    ),
)

HIGHEST = Block(
    "Highest source resistance",
    (
        Quantity(
            "tau_max",
            "longest time constant that still settles",
            "FO_TAU_FOR(e_ok*V_lsb,t_acq_lo,V_off,0)",
            "time",
            "tau_max = t_acq,lo / ln(V_off / (e_ok V_lsb))",
            "t_acq_lo/LN(V_off*2^n_bits/(e_ok*V_span))",
        ),
        Quantity(
            "R_max",
            "highest source resistance",
            "IF(tau_max>R_sw_hi*C_samp_hi,(tau_max-R_sw_hi*C_samp_hi)/(C_samp_hi+C_stray_hi),NA())",
            "resistance",
            "R_max = (tau_max - R_sw,hi C_samp,hi) / (C_samp,hi + C_stray,hi); no result where the "
            "switch alone is too slow",
            "IF(t_acq_lo>R_sw_hi*C_samp_hi*LN(V_off*2^n_bits/(e_ok*V_span)),(t_acq_lo"
            "/LN(V_off*2^n_bits/(e_ok*V_span))-R_sw_hi*C_samp_hi)/(C_samp_hi+C_stray_hi),NA())",
        ),
    ),
)

ORDER = Block(
    "Two capacitors",
    (
        Quantity(
            "tau_slow",
            "slower of the two time constants, worst case",
            f"({_TAU_HI}+SQRT(MAX(0,({_TAU_HI})^2-4*R_src_hi*R_sw_hi*C_samp_hi*C_stray_hi)))/2",
            "time",
            "tau_slow, the larger root of s^2 - tau_hi s + R_src R_sw C_samp C_stray = 0: what the "
            "error ends with",
        ),
        Quantity(
            "k_safe",
            "time constant used, as a multiple of it",
            "tau_hi/tau_slow",
            NUMBER,
            "k_safe = tau_hi / tau_slow, from 1 to 2: how much the sheet is on the safe side",
        ),
    ),
)

_PARTS = (
    Varies("R_src"),
    Varies("R_sw"),
    Varies("C_samp"),
    Varies("C_stray"),
)

CHECKS = (
    Check(
        "error",
        "Settled error, in LSB",
        "e_set_max",
        "e_ok",
        NUMBER,
        "Error budget; all of V_off at the worst corner",
    ),
    Check(
        "half",
        "Time to 1/2 LSB",
        "t_half_max",
        "t_acq_lo",
        "time",
        "(N + 1) ln 2 time constants from one span (common practice), against the shortest "
        "acquisition",
    ),
    Check(
        "source",
        "Source resistance",
        "R_src_hi",
        "R_max",
        "resistance",
        "Highest that settles to e_ok within the shortest acquisition",
    ),
)

HAZARDS = (
    Hazard(
        "Two capacitors",
        "k_safe>1.02",
        "Stray and sample capacitor make the circuit second order. The sum of both time constants "
        "is used, {k_safe} times the slower one: on the safe side after about two of them.",
    ),
    Hazard(
        "Too early to tell",
        "n_tau<2",
        "The acquisition lasts {n_tau} time constants. Before two, the sum of the time constants "
        "need not be on the safe side.",
    ),
    Hazard(
        "Capacitor at the pin",
        "C_stray_hi>10*C_samp_hi",
        "The capacitance at the pin is more than ten times the sample capacitor: it shares its "
        "charge at once and then recovers through R_src between samples, which is not reckoned "
        "here.",
    ),
    Hazard(
        "Kick-back",
        "Q_kick_hi/C_samp_lo>V_begin/10",
        "The kick-back raises the starting error by more than a tenth, to {V_off}.",
    ),
)


def _log2(value: str) -> str:
    return f"LN(({value})/V_lsb)/LN(2)"


CURVE = Curve(
    end="t_acq",
    time_unit="us",
    quantity=NUMBER,
    unit="",
    y_title="error, as a power of two of one LSB",
    caption="Acquisition begins at 0. A straight fall is one exponential: each step of the scale "
    "is one bit, 0 is one LSB, -1 is 1/2 LSB. Worst case: R_src, R_sw, C_samp and C_stray at "
    "their highest.",
    traces=(
        Trace("worst case", _log2("FO_NATURAL(t,tau_hi,V_off)")),
        Trace("nominal", _log2("FO_NATURAL(t,tau,V_off)")),
    ),
    levels=(Level("error allowed", "LN(e_ok)/LN(2)"),),
    moments=(Moment("shortest acquisition", "t_acq_lo"),),
    marks=(Mark("1/2 LSB, worst case", "t_half_max", "-1"),),
    from_zero=False,
)

CAUTIONS = (
    Caution(
        "What the reading is used for",
        "A sample that has not settled reads low or high by a share of the channel before it: an "
        "overload guard may see a lighter load than hangs on the hook. Check the guard with a "
        "known load, not by this page alone.",
    ),
    Caution(
        "Source resistance drifts",
        "A corroded terminal, a longer cable or a wiper adds to R_src. Leave margin, or test with "
        "the highest resistance that can come about.",
    ),
    Caution(
        "Energy at the input",
        "Limit the current into the pin before connecting a long cable: protection diodes conduct "
        "a surge, and a live signal on an unpowered converter feeds its supply.",
    ),
)

BASIS = Basis(
    method=(
        "Natural response of the error: e(t) = V_off exp(-t / tau), tau = (R_src + R_sw) C_samp "
        "+ R_src C_stray, the sum of the open-circuit time constants. The slower of the two real "
        "time constants is never longer than this sum.",
        "Worst case over every corner of R_src, R_sw, C_samp, C_stray and the acquisition time; "
        "the starting error is taken at its highest throughout.",
    ),
    assumptions=(
        "The signal stands still during the acquisition, and the source is resistive.",
        "The sample capacitor begins V_begin away from the signal, and takes all of the kick-back.",
        "Switch resistance does not change with the signal within its limits.",
    ),
    sources=(
        "Settling to 1/2 LSB of N bits in (N + 1) ln 2 time constants: common practice.",
        "Sum of open-circuit time constants as an upper bound of the slower: closed form of the "
        "two-capacitor circuit, tested against its exact solution.",
    ),
    not_covered=(
        "Settling and slewing of a driving amplifier, a filter capacitor at the pin that recovers "
        "between samples, dielectric absorption of the sample capacitor, leakage, aperture jitter, "
        "noise, and the other errors of the converter.",
    ),
)

SHEET = Sheet(
    name="sampling",
    title="Settling of a sampling input",
    question="does the sample capacitor settle to the converter's resolution in the acquisition "
    "time?",
    purpose="To show that the sample capacitor of the converter settles to its resolution within "
    "the acquisition time, through the resistance of the source.",
    picture=Picture(
        "sampling.png",
        "The sampling switch closes at t = 0 and opens at t_acq. The sample capacitor begins "
        "V_begin away from the signal.",
    ),
    groups=(SOURCE, CONVERTER, START),
    blocks=(SETTLING, HIGHEST, ORDER),
    worst_cases=(
        WorstCase(
            "e_set",
            f"FO_NATURAL(t_acq,{_TAU},V_begin+Q_kick_hi/C_samp_lo)*2^n_bits/V_span",
            (*_PARTS, Varies("t_acq")),
        ),
        WorstCase(
            "t_half",
            f"FO_TIME_UNTIL_BELOW(V_span/2^n_bits/2,{_TAU},V_begin+Q_kick_hi/C_samp_lo,0)",
            _PARTS,
        ),
    ),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-006",
        "Load-cell channel: sampling",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
)
"""The calc sheet."""
