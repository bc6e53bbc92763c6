"""When does an R-C delay or reset input switch, over tolerance?

The supply rises in a straight line and holds. Leakage of the capacitor and current into the input
turn the resistor and the supply into an equivalent: a lower final value and a shorter time
constant. The crossing of a rising line's response has no closed form while the line still rises;
the second way goes there by Newton's steps.
"""

from __future__ import annotations

from tausheet.templates.model import (
    Basis,
    Block,
    Caution,
    Check,
    Curve,
    Demo,
    Formed,
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
    Sense,
    Sheet,
    Tolerance,
    Trace,
    Varies,
    WorstCase,
)

SUPPLY = Group(
    "Supply",
    (
        Input(
            "V_sup",
            "supply once it is up",
            "voltage",
            ("V", "mV", "kV"),
            0.1,
            1e4,
            "no delay or reset circuit is fed from outside this",
            Demo("5 V", "supply data sheet", "4.75 V", "5.25 V"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "t_ramp",
            "time that it takes to rise, from 0 in a straight line",
            "time",
            ("ms", "us", "s", "ns"),
            0.0,
            1e5,
            "a supply rises at once or slowly, never before it is switched on",
            Demo("20 ms", "supply data sheet, full load and no load", "5 ms", "30 ms"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "t_dip",
            "shortest loss of the supply after which the delay must start again",
            "time",
            ("ms", "us", "s"),
            1e-9,
            1e6,
            "a loss that counts lasts between these",
            Demo("10 ms", "requirements of the brake controller"),
        ),
    ),
)

PARTS = Group(
    "Resistor, capacitor and input",
    (
        Input(
            "R_time",
            "resistor that charges the capacitor",
            "resistance",
            ("kohm", "ohm", "Mohm"),
            0.1,
            1e10,
            "no timing resistor lies outside this",
            Demo("100 kohm", "resistor data sheet, 1 % and temperature", "-2 %", "2 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "C_time",
            "capacitor",
            "capacitance",
            ("uF", "nF", "pF", "mF"),
            1e-12,
            10.0,
            "no timing capacitor lies outside this",
            Demo("1 uF", "capacitor data sheet, film, with temperature", "-12 %", "12 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "I_leak",
            "leakage of the capacitor, taken as a resistance",
            "current",
            ("nA", "uA", "mA", "pA"),
            0.0,
            1.0,
            "it flows through the capacitor, and 1 A would destroy it",
            Demo("10 nA", "capacitor data sheet, 85 C", "0 nA", "50 nA"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "V_leak",
            "voltage at which that leakage is stated",
            "voltage",
            ("V", "kV"),
            0.1,
            1e4,
            "leakage is stated between these",
            Demo("50 V", "capacitor data sheet, rated voltage"),
        ),
        Input(
            "I_in",
            "current into the input (negative: out of it)",
            "current",
            ("uA", "nA", "mA", "pA"),
            -1.0,
            1.0,
            "no input of such a circuit takes or gives more",
            Demo("0 uA", "input data sheet", "-1 uA", "1 uA"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "V_th",
            "threshold of the input for a rising voltage",
            "voltage",
            ("V", "mV", "kV"),
            1e-3,
            1e4,
            "no input switches outside this",
            Demo("2.8 V", "input data sheet, at 5 V", "2.4 V", "3.2 V"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "V_off",
            "voltage below which the input has surely fallen back, lowest",
            "voltage",
            ("V", "mV", "kV"),
            1e-3,
            1e4,
            "no input falls back outside this",
            Demo("1 V", "input data sheet, falling threshold, lowest"),
            rules=(
                Rule(
                    "V_off<=V_th_lo",
                    "is above the lowest V_th: an input falls back at or below the voltage at "
                    "which it switched",
                ),
            ),
        ),
    ),
)

DISCHARGE = Group(
    "Discharge while the supply is lost",
    (
        Input(
            "R_dis",
            "resistance of the discharge path (that of R_time where there is no other)",
            "resistance",
            ("kohm", "ohm", "Mohm"),
            1e-3,
            1e10,
            "no discharge path lies outside this",
            Demo("1 kohm", "resistor in series with the diode, data sheet", "-5 %", "5 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "V_dis",
            "voltage towards which it discharges: rest of the supply and drop of the diode",
            "voltage",
            ("V", "mV"),
            0.0,
            1e4,
            "the capacitor discharges to 0 V or to what the path leaves on it",
            Demo("0.6 V", "diode data sheet; supply collapses to 0", "0.4 V", "0.75 V"),
            Tolerance.ABSOLUTE,
        ),
    ),
)

WINDOW = Group(
    "Delay asked for",
    (
        Input(
            "t_hold",
            "shortest delay, counted from the end of the supply's rise",
            "time",
            ("ms", "us", "s", "ns"),
            0.0,
            1e6,
            "a delay asked for is not negative",
            Demo("10 ms", "brake controller data sheet, reset after the supply is up"),
        ),
        Input(
            "t_most",
            "longest delay, counted from the beginning of the supply's rise",
            "time",
            ("ms", "us", "s", "ns"),
            1e-9,
            1e6,
            "a delay allowed lies between these",
            Demo("200 ms", "start sequence of the crane control"),
            rules=(
                Rule(
                    "t_most>t_hold+t_ramp_hi",
                    "leaves no room: the shortest delay begins only at the end of the rise",
                ),
            ),
        ),
    ),
)

STEPS = 40
"""Newton's steps of the second way; each at least halves what is left, near the end far more."""


def _part(end: str) -> tuple[str, str]:
    """Time constant and final value with the parts at an end: "_lo" charges fastest, "_hi" slowest.

    The supply goes the other way round.
    """
    other = {"_lo": "_hi", "_hi": "_lo", "": ""}[end]
    share = f"(1+R_time{end}*I_leak{end}/V_leak)"
    return (
        f"R_time{end}*C_time{end}/{share}",
        f"(V_sup{other}-R_time{end}*I_in{end})/{share}",
    )


def _risen(tau: str, final: str, ramp: str) -> str:
    """Voltage at the end of the rise, by its closed form; a short rise by a series."""
    ratio = f"({ramp}/{tau})"
    return (
        f"{final}*(1-IF({ratio}<1E-4,1-{ratio}/2+{ratio}^2/6,(1-EXP(-{ratio}))/MAX({ratio},1E-9)))"
    )


def _crossed(column: str, level: str, tau: str, final: str, ramp: str, risen: str) -> str:
    """Time to a level with built-in functions: Newton's steps during the rise, else closed form."""
    return (
        f"IF(AND({final}>0,{level}<{final}),IF({level}<{risen},INDEX(newton_{column},{STEPS + 1}),"
        f"{ramp}+{tau}*(LN({final}-{risen})-LN({final}-{level}))),NA())"
    )


def _newton(level: str, tau: str, final: str, ramp: str) -> tuple[str, str]:
    """First value and step of t - tau (1 - exp(-t / tau)) = level ramp / final, from above."""
    goal = f"{level}*{ramp}/{final}"
    x = "above_COLUMN"
    return (
        f"{goal}+{tau}",
        f"{x}-({x}-{tau}*(1-EXP(-{x}/{tau}))-{goal})/(1-EXP(-{x}/{tau}))",
    )


CHARGE = Block(
    "Equivalent of supply, resistor, leakage and input current",
    (
        Quantity(
            "tau",
            "time constant, nominal",
            f"FO_TAU_RC({_part('')[0].replace('*C_time', '')},C_time)",
            "time",
            "tau = R_time C_time / (1 + R_time I_leak / V_leak): leakage lies beside R_time",
        ),
        Quantity(
            "V_fin",
            "voltage that the capacitor heads for, nominal",
            _part("")[1],
            "voltage",
            "V_fin = (V_sup - R_time I_in) / (1 + R_time I_leak / V_leak)",
        ),
        Quantity(
            "tau_slow",
            "time constant of the slowest charge",
            f"FO_TAU_RC({_part('_hi')[0].replace('*C_time_hi', '')},C_time_hi)",
            "time",
            "as tau, with R_time, C_time and I_leak at their highest",
        ),
        Quantity(
            "V_slow",
            "voltage that it heads for",
            _part("_hi")[1],
            "voltage",
            "as V_fin, with V_sup at its lowest, R_time, I_leak and I_in at their highest",
        ),
        Quantity(
            "V_least",
            "voltage that the capacitor heads for, lowest",
            "MIN(V_slow,(V_sup_lo-R_time_lo*I_in_hi)/(1+R_time_lo*I_leak_hi/V_leak))",
            "voltage",
            "V_slow, or the same with R_time at its lowest where the input gives current",
            "MIN(V_sup_lo-R_time_hi*(I_in_hi+V_slow*I_leak_hi/V_leak),(V_sup_lo/R_time_lo-I_in_hi)"
            "/(1/R_time_lo+I_leak_hi/V_leak))",
        ),
        Quantity(
            "tau_fast",
            "time constant of the fastest charge",
            f"FO_TAU_RC({_part('_lo')[0].replace('*C_time_lo', '')},C_time_lo)",
            "time",
            "as tau, with R_time, C_time and I_leak at their lowest",
        ),
        Quantity(
            "V_fast",
            "voltage that it heads for",
            _part("_lo")[1],
            "voltage",
            "as V_fin, with V_sup at its highest, R_time, I_leak and I_in at their lowest",
        ),
    ),
)

_NOMINAL = ("V_th", "(R_time*C_time/(1+R_time*I_leak/V_leak))", "V_fin", "t_ramp_hi")
_FASTEST = ("V_th_lo", f"({_part('_lo')[0]})", "V_fast", "t_ramp_lo")

SWITCHING = Block(
    "Switching",
    (
        Quantity(
            "V_rise",
            "voltage at the end of the longest rise, nominal",
            "FO_RAMP(t_ramp_hi,tau,0,0,V_fin,t_ramp_hi)",
            "voltage",
            "V_fin (1 - tau (1 - exp(-t_ramp / tau)) / t_ramp), t_ramp at its longest",
            _risen(*_NOMINAL[1:]),
        ),
        Quantity(
            "t_switch",
            "time to switching, longest rise, nominal",
            'FO_CROSSING(V_th/V_fin,tau,0,slow,"rising")',
            "time",
            "from the beginning of the rise. After its end: t_ramp + tau ln((V_fin - V_rise) / "
            "(V_fin - V_th)); before: from t - tau (1 - exp(-t / tau)) = t_ramp V_th / V_fin",
            _crossed("switch", *_NOMINAL, "V_rise_hand"),
        ),
        Quantity(
            "t_step",
            "the same if the supply came at once",
            "FO_TIME_TO(V_th,tau,0,V_fin)",
            "time",
            "tau ln(V_fin / (V_fin - V_th)): what a calculation without the rise would say",
        ),
        Quantity(
            "t_after",
            "from the end of the rise to switching, shortest",
            "t_switch_min-t_ramp_hi",
            "time",
            "the earliest of part 6, less the longest rise; negative: it switches while the "
            "supply still rises",
        ),
        Quantity(
            "V_soon",
            "voltage at the end of the shortest rise, fastest",
            "FO_RAMP(t_ramp_lo,tau_fast,0,0,V_fast,t_ramp_lo)",
            "voltage",
            "as V_rise, with the fastest charge and t_ramp at its shortest",
            _risen(*_FASTEST[1:]),
        ),
        Quantity(
            "t_soon",
            "earliest of all switching, shortest rise",
            'FO_CROSSING(V_th_lo/V_fast,tau_fast,0,quick,"rising")',
            "time",
            "from the beginning of the rise, with the fastest charge and the lowest threshold",
            _crossed("soon", *_FASTEST, "V_soon_hand"),
        ),
    ),
)

_TAU_DIS = "R_dis_hi*C_time_hi"

RECOVERY = Block(
    "Loss of the supply and recovery, worst case",
    (
        Quantity(
            "V_full",
            "voltage of the capacitor when the supply is lost, highest",
            "V_sup_hi+R_time_hi*MAX(0,-I_in_lo)",
            "voltage",
            "V_sup,hi, and what a current out of the input adds; no leakage",
        ),
        Quantity(
            "tau_dis",
            "time constant of the discharge, longest",
            "FO_TAU_RC(R_dis_hi,C_time_hi)",
            "time",
            "tau_dis = R_dis,hi C_time,hi",
        ),
        Quantity(
            "t_reset",
            "time to fall back, longest",
            "FO_TIME_UNTIL_BELOW(V_off,tau_dis,V_full,V_dis_hi)",
            "time",
            "tau_dis ln((V_full - V_dis) / (V_off - V_dis)); no result where V_dis reaches V_off",
            f"{_TAU_DIS}*(LN(V_full-V_dis_hi)-LN(V_off-V_dis_hi))",
        ),
        Quantity(
            "V_back",
            "voltage left after the shortest loss, highest",
            "FO_STEP(t_dip,tau_dis,V_full,V_dis_hi)",
            "voltage",
            "V_back = V_dis + (V_full - V_dis) exp(-t_dip / tau_dis)",
            f"V_dis_hi+(V_full-V_dis_hi)*EXP(-t_dip/({_TAU_DIS}))",
        ),
        Quantity(
            "V_up",
            "voltage at the end of the longest rise that follows, fastest",
            "FO_RAMP(t_ramp_hi,tau_fast,V_back,0,V_fast,t_ramp_hi)",
            "voltage",
            "the fastest charge, from V_back",
            f"V_back_hand*EXP(-t_ramp_hi/{_FASTEST[1]})+{_risen(*_FASTEST[1:3], 't_ramp_hi')}",
        ),
        Quantity(
            "t_again",
            "delay after it, from the end of the rise, shortest",
            "FO_TIME_TO(V_th_lo,tau_fast,V_up,V_fast)",
            "time",
            "tau ln((V_fast - V_up) / (V_fast - V_th,lo)); no result where the threshold has been "
            "passed before the end of the rise",
            f"IF(AND(V_up_hand<=V_th_lo,V_th_lo<V_fast),{_FASTEST[1]}*(LN(V_fast-V_up_hand)"
            "-LN(V_fast-V_th_lo)),NA())",
        ),
    ),
)

WORST = WorstCase(
    "t_switch",
    "FO_CROSSING(V_th*(1+R_time*I_leak/V_leak)/(V_sup-R_time*I_in),"
    'R_time*C_time/(1+R_time*I_leak/V_leak),0,slow,"rising")',
    (
        Varies("R_time"),
        Varies("C_time"),
        Varies("V_sup"),
        Varies("V_th"),
        Varies("I_in"),
        Varies("I_leak"),
    ),
    draws=60,
)

CHECKS = (
    Check(
        "level",
        "Voltage that the capacitor heads for",
        "V_least",
        "V_th_hi",
        "voltage",
        "It must lie above the highest threshold, or the input never switches",
        Sense.AT_LEAST,
    ),
    Check(
        "earliest",
        "Earliest switching, after the rise",
        "t_after",
        "t_hold",
        "time",
        "Shortest delay asked for; the longest rise leaves the least of it",
        Sense.AT_LEAST,
    ),
    Check(
        "latest",
        "Latest switching, from the start",
        "t_switch_max",
        "t_most",
        "time",
        "Longest delay allowed",
    ),
    Check(
        "reset",
        "Time to fall back",
        "t_reset",
        "t_dip",
        "time",
        "A loss as short as this must start the delay again",
    ),
    Check(
        "again",
        "Delay after the shortest loss",
        "t_again",
        "t_hold",
        "time",
        "Shortest delay asked for, from what is left in the capacitor",
        Sense.AT_LEAST,
    ),
)

HAZARDS = (
    Hazard(
        "Never switches",
        "V_least<=V_th_hi",
        "Leakage, input current and low supply let the capacitor rise to {V_least} only: the input "
        "need not switch at all.",
    ),
    Hazard(
        "Threshold close to the final value",
        "AND(V_least>V_th_hi,V_th_hi>0.9*V_least)",
        "The capacitor heads for {V_least}, little above the threshold: the last part of the time "
        "depends on leakage and noise more than on R_time and C_time.",
    ),
    Hazard(
        "Supply not short against tau",
        "t_ramp_hi>0.1*tau_fast",
        "The supply may take more than a tenth of the time constant to rise. As if it came at once "
        "the nominal time would be {t_step}; with the longest rise it is {t_switch}, which is "
        "what counts here.",
    ),
    Hazard(
        "Switches while the supply rises",
        "t_after<0",
        "The earliest switching is {t_after} after the end of the rise, so before it: the delay is "
        "over while the supply is not up.",
    ),
    Hazard(
        "Slow edge without hysteresis",
        "V_off>0.98*V_th_lo",
        "The input sees a slow edge and falls back where it switches: noise makes it switch many "
        "times. Take an input with hysteresis.",
    ),
)


def _table() -> Formed:
    columns = {"switch": _newton(*_NOMINAL), "soon": _newton(*_FASTEST)}
    first = tuple(start for start, _ in columns.values())
    later = tuple(step.replace("COLUMN", name) for name, (_, step) in columns.items())
    return Formed("newton", tuple(columns), (first, *(later for _ in range(STEPS))))


CURVE = Curve(
    end="MAX(1.2*t_most,2*t_ramp_hi)",
    time_unit="ms",
    quantity="voltage",
    unit="V",
    y_title="voltage of the capacitor",
    caption="The supply begins to rise at 0, the capacitor empty before it; longest rise for both. "
    "Latest: V_sup lowest, R_time, C_time, I_leak and I_in highest. Earliest: the other way round.",
    traces=(
        Trace("latest", "FO_RAMP(t,tau_slow,0,0,V_slow,t_ramp_hi)"),
        Trace("earliest", "FO_RAMP(t,tau_fast,0,0,V_fast,t_ramp_hi)"),
    ),
    levels=(Level("threshold, highest", "V_th_hi"), Level("threshold, lowest", "V_th_lo")),
    moments=(Moment("earliest allowed", "t_ramp_hi+t_hold"), Moment("latest allowed", "t_most")),
    marks=(Mark("switches, latest", "t_switch_max", "V_th_hi"),),
)

CAUTIONS = (
    Caution(
        "A delay is no safety function",
        "One open resistor, shorted diode or dry capacitor makes the delay endless or takes it "
        "away. Where a wrong delay can hurt someone, monitor it or use a device made for it.",
    ),
    Caution(
        "State while the delay runs",
        "Outputs must be safe from the first volt of the supply until the input has switched, and "
        "again from the first dip. Below its own lowest supply no input state is defined.",
    ),
    Caution(
        "Short dips",
        "A loss shorter than the time to fall back shortens the next delay or takes it away. Test "
        "with dips of every length, not with switching off for a minute.",
    ),
    Caution(
        "Ageing, damp and dirt",
        "Leakage across a board grows with damp and dirt, and that of electrolytic capacitors with "
        "age and rest. Enter what the end of life may bring.",
    ),
    Caution(
        "Stored charge at the input",
        "When the supply is lost the capacitor feeds back through the input. Keep the current "
        "below what the input stands: a resistor at the input, a diode to the supply.",
    ),
)

BASIS = Basis(
    method=(
        "Step and ramp response of one resistance and one capacitance. Leakage as a resistance "
        "V_leak / I_leak beside the capacitor and the input current turn supply and R_time into "
        "their equivalent (Thevenin).",
        "The crossing is found with the longest rise: it gives both the latest switching, and the "
        "earliest one as counted from the end of the rise.",
        "Every check takes the worst corner of the tolerances.",
    ),
    assumptions=(
        "The capacitor is empty at first; after a loss of the supply it holds V_back.",
        "The supply rises in a straight line from 0. The input current rises with it, and so does "
        "nothing before it.",
        "A threshold that is a share of the supply: enter V_sup without a tolerance and V_th at "
        "that V_sup, since only V_th / V_sup counts then.",
        "While the supply is lost nothing but the discharge path acts; leakage, left out, would "
        "hasten it. Parts vary independently within their limits.",
    ),
    sources=(
        "Equations: closed form of tau dy/dt + y = x for a ramp; Newton's method for the time at "
        "which it passes a level.",
        "A rise short against the time constant, below a tenth of it, as negligible: common "
        "practice; here it is reckoned with in any case.",
    ),
    not_covered=(
        "Supplies that rise in steps or overshoot, dielectric absorption, capacitance that changes "
        "with voltage (class 2 ceramics), the delay of the input itself, and noise at the input.",
    ),
)

SHEET = Sheet(
    name="delay",
    title="R-C delay or reset input",
    question="when does an R-C delay or reset input switch, over tolerance?",
    purpose="To show that the input switches neither too early after the supply is up nor too "
    "late, over all tolerances, and that a short loss of the supply starts the delay again.",
    picture=Picture(
        "delay.png",
        "The supply begins to rise at t = 0 and is up after t_ramp. The input switches when the "
        "capacitor has passed V_th. When the supply is lost the capacitor empties through R_dis.",
    ),
    groups=(SUPPLY, PARTS, DISCHARGE, WINDOW),
    blocks=(CHARGE, SWITCHING, RECOVERY),
    worst_cases=(WORST,),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-003",
        "Brake controller: reset input",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
    formed=(
        Formed("slow", ("shape", "to", "lasts"), (('"ramp"', "1", "t_ramp_hi"),)),
        Formed("quick", ("shape", "to", "lasts"), (('"ramp"', "1", "t_ramp_lo"),)),
        _table(),
    ),
)
"""The calc sheet."""
