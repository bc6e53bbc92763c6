"""How long, how hot and how hard is the pre-charge of a capacitor bank?

A resistor charges the bank until a threshold, then a bypass closes over it. What the bank feeds
meanwhile, a resistance and a current, takes part of the charge. A rectified three-phase line has
two values here: its peak, for current and heat, and its mean, for the time.
"""

from __future__ import annotations

from tausheet.templates.model import (
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

LINE = "three-phase line, rectified"

SUPPLY = Group(
    "Supply",
    (
        Choice(
            "supply",
            "what charges the bank",
            (LINE, "d.c. supply"),
            Demo(LINE, "schematic of the hoist drive"),
        ),
        Input(
            "V_in",
            "its voltage: r.m.s. between lines, or d.c.",
            "voltage",
            ("V", "kV"),
            5.0,
            20e3,
            "below there is no need of a pre-charge, above it takes more than one resistor",
            Demo("400 V", "crane transformer with its taps, load study", "-5 %", "5 %"),
            Tolerance.PERCENT,
        ),
    ),
)

BANK = Group(
    "Capacitor bank and what it feeds while it charges",
    (
        Input(
            "C_bank",
            "capacitance of the bank",
            "capacitance",
            ("mF", "uF", "F"),
            1e-7,
            1e3,
            "a bank that needs a pre-charge lies between these",
            Demo("4.7 mF", "Q4-CAL-001, two levels of two capacitors", "-20 %", "20 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "R_par",
            "lowest resistance across the bank (1 Gohm where there is none)",
            "resistance",
            ("kohm", "ohm", "Mohm", "Gohm"),
            0.1,
            1e9,
            "discharge resistors and loads lie between these; 1 Gohm stands for none",
            Demo("14.2 kohm", "Q4-CAL-001, four chains of two resistors, less 5 %"),
        ),
        Input(
            "I_load",
            "current drawn from the bank meanwhile",
            "current",
            ("mA", "A", "uA"),
            0.0,
            1e4,
            "it is drawn from the bank; more would be the drive itself running",
            Demo("60 mA", "data sheet of the drive's own control supply", "30 mA", "100 mA"),
            Tolerance.ABSOLUTE,
        ),
    ),
)

RESISTOR = Group(
    "Pre-charge resistor",
    (
        Input(
            "R_pre",
            "resistance",
            "resistance",
            ("ohm", "kohm", "mohm"),
            1e-3,
            1e7,
            "no pre-charge resistor lies outside this",
            Demo("68 ohm", "resistor data sheet, 10 % with temperature", "-10 %", "10 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "E_pulse",
            "energy of one pulse that it stands, from working temperature",
            "energy",
            ("kJ", "J", "mJ"),
            1e-6,
            1e9,
            "no resistor stands more or less than this",
            Demo("12 kJ", "resistor data sheet, wire wound, pulse diagram"),
        ),
        Input(
            "P_rated",
            "rated power",
            "power",
            ("W", "kW", "mW"),
            1e-3,
            1e6,
            "no pre-charge resistor is rated outside this",
            Demo("200 W", "resistor data sheet, free air"),
        ),
        Input(
            "k_amb",
            "share of power and pulse energy left at the highest ambient",
            "ratio",
            ("%",),
            0.01,
            1.0,
            "derating takes away, it never adds",
            Demo("85 %", "resistor data sheet, derating line at 55 C"),
        ),
        Input(
            "I_allow",
            "highest first current allowed",
            "current",
            ("A", "kA", "mA"),
            1e-3,
            1e6,
            "no contactor, fuse or rectifier of such a circuit lies outside this",
            Demo("16 A", "pre-charge contactor data sheet, making current"),
        ),
        Input(
            "t_rep",
            "shortest time between two charges",
            "time",
            ("s", "min", "h", "ms"),
            1e-3,
            1e6,
            "a longer interval counts for nothing, a shorter one is a slip",
            Demo("60 s", "restart inhibit of the crane control"),
            rules=(
                Rule(
                    "t_rep>t_out_hi",
                    "is not above the time-out: the next charge would begin before the last "
                    "is given up",
                ),
            ),
        ),
    ),
)

BYPASS = Group(
    "Bypass",
    (
        Input(
            "V_close",
            "voltage of the bank at which the bypass closes",
            "voltage",
            ("V", "kV"),
            0.1,
            50e3,
            "a threshold outside this fits no supply of this sheet",
            Demo("460 V", "drive parameters; voltage relay within 10 V", "450 V", "470 V"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "R_path",
            "resistance left in the path once it is closed",
            "resistance",
            ("mohm", "ohm", "uohm"),
            1e-6,
            1e5,
            "line, choke, contacts and the bank's own series resistance lie between these",
            Demo("150 mohm", "line 50, choke 60, bank 40 mohm; data sheets", "-20 %", "20 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "I_step",
            "highest current allowed when it closes",
            "current",
            ("A", "kA"),
            1e-3,
            1e7,
            "no rectifier, contactor or fuse of such a circuit lies outside this",
            Demo("1500 A", "rectifier data sheet, surge current, 10 ms"),
        ),
        Input(
            "t_out",
            "time-out: the charge is given up and locked out",
            "time",
            ("s", "ms", "min"),
            1e-4,
            1e5,
            "a watch on a pre-charge acts between these",
            Demo("1.5 s", "drive parameters", "1.4 s", "1.6 s"),
            Tolerance.ABSOLUTE,
        ),
    ),
)

_SHARE = "R_par/(R_par+R_pre)"
_TAU = f"FO_TAU_RC(R_pre*{_SHARE},C_bank)"
_END = f"(k_mean*V_in-I_load*R_pre)*{_SHARE}"
_TOP = f"(k_peak*V_in-I_load*R_pre)*{_SHARE}"
_LOW_SHARE = "R_par/(R_par+R_pre_hi)"

LEVELS = Block(
    "Supply as it charges the bank",
    (
        Quantity(
            "k_peak",
            "peak of the supply over the voltage entered",
            f'IF(supply="{LINE}",SQRT(2),1)',
            "number",
            "sqrt(2) for a line, 1 for d.c.; for current and heat",
        ),
        Quantity(
            "k_mean",
            "mean of the supply over the voltage entered",
            f'IF(supply="{LINE}",3*SQRT(2)/PI(),1)',
            "number",
            "3 sqrt(2) / pi = 1.350 for a six-pulse rectifier, 1 for d.c.; for the time",
        ),
        Quantity(
            "V_peak",
            "peak of the supply, highest",
            "k_peak*V_in_hi",
            "voltage",
            "V_peak = k_peak V_in,hi",
        ),
        Quantity(
            "V_end",
            "voltage that the bank heads for, nominal",
            _END,
            "voltage",
            "V_end = (k_mean V_in - I_load R_pre) R_par / (R_par + R_pre): the load takes its part",
        ),
        Quantity(
            "V_least",
            "the same, lowest",
            f"(k_mean*V_in_lo-I_load_hi*R_pre_hi)*{_LOW_SHARE}",
            "voltage",
            "V_end with V_in at its lowest, I_load and R_pre at their highest",
            "k_mean*V_in_lo-R_pre_hi*(I_load_hi+(k_mean*V_in_lo-I_load_hi*R_pre_hi)"
            "/(R_par+R_pre_hi))",
        ),
    ),
)

CHARGE = Block(
    "Charge",
    (
        Quantity(
            "tau",
            "time constant, nominal",
            _TAU,
            "time",
            "tau = C_bank R_pre R_par / (R_pre + R_par)",
        ),
        Quantity(
            "tau_late",
            "time constant when the charge is slowest",
            "FO_TAU_RC(R_pre_hi*R_par/(R_par+R_pre_hi),C_bank_hi)",
            "time",
            "tau of the corner that decides the longest time",
        ),
        Quantity(
            "t_close",
            "time to the threshold, nominal",
            "FO_TIME_TO(V_close,tau,0,V_end)",
            "time",
            "t_close = tau ln(V_end / (V_end - V_close))",
            f"C_bank/(1/R_pre+1/R_par)*(LN({_END})-LN({_END}-V_close))",
        ),
        Quantity(
            "I_first",
            "first current, highest",
            "V_peak/R_pre_lo",
            "current",
            "I_first = V_peak / R_pre,lo, the bank being empty",
            "SQRT(V_peak^2/R_pre_lo/R_pre_lo)",
        ),
        Quantity(
            "I_close",
            "current step when the bypass closes, highest",
            "MAX(0,V_peak-V_close_lo)/R_path_lo",
            "current",
            "I_close = (V_peak - V_close,lo) / R_path,lo: the bypass closes as soon as the lowest "
            "threshold is reached, the supply at its highest",
            "MAX(0,k_peak*V_in_hi/R_path_lo-V_close_lo/R_path_lo)",
        ),
    ),
)

HEAT = Block(
    "Heat in the resistor",
    (
        Quantity(
            "V_top",
            "voltage that the bank heads for at the peak of the supply",
            _TOP,
            "voltage",
            "V_top = (k_peak V_in - I_load R_pre) R_par / (R_par + R_pre)",
        ),
        Quantity(
            "V_drop",
            "voltage that the load leaves on the resistor",
            "k_peak*V_in-V_top",
            "voltage",
            "V_drop = k_peak V_in - V_top",
        ),
        Quantity(
            "E_charge",
            "energy of one charge, nominal",
            'FO_DISSIPATED(R_pre,"voltage",tau,V_top,0)+V_drop*(2*V_top*tau+V_drop*t_out_hi)/R_pre',
            "energy",
            "integral of (V_drop + V_top exp(-t / tau))^2 / R_pre: the charge taken to its end, "
            "the load drawn until the latest time-out, whenever the bypass closes",
            f"C_bank*{_SHARE}*V_top*(V_top/2+2*V_drop)+V_drop^2*t_out_hi/R_pre",
        ),
        Quantity(
            "P_mean",
            "mean power, nominal",
            "E_charge/t_rep",
            "power",
            "P_mean = E_charge / t_rep",
            f"(C_bank*{_SHARE}*V_top*(V_top/2+2*V_drop)+V_drop^2*t_out_hi/R_pre)/t_rep",
        ),
        Quantity(
            "P_most",
            "mean power, worst case",
            "E_charge_max/t_rep",
            "power",
            "the largest E_charge of part 6, over t_rep",
        ),
        Quantity(
            "P_short",
            "power with a shorted bank, highest",
            "V_peak^2/R_pre_lo",
            "power",
            "P_short = V_peak^2 / R_pre,lo",
        ),
        Quantity(
            "E_short",
            "energy with a shorted bank until the time-out, highest",
            'FO_DISSIPATED(R_pre_lo,"voltage",tau,V_peak,V_peak,0,t_out_hi)',
            "energy",
            "E_short = V_peak^2 t_out,hi / R_pre,lo: nothing limits it but the time-out",
            "P_short*t_out_hi",
        ),
        Quantity(
            "E_allow",
            "pulse energy allowed at the highest ambient",
            "k_amb*E_pulse",
            "energy",
            "E_allow = k_amb E_pulse",
        ),
        Quantity(
            "P_allow",
            "power allowed at the highest ambient",
            "k_amb*P_rated",
            "power",
            "P_allow = k_amb P_rated",
        ),
    ),
)

WORST_TIME = WorstCase(
    "t_close",
    f"FO_TIME_TO(V_close,{_TAU},0,{_END})",
    (
        Varies("R_pre"),
        Varies("C_bank"),
        Varies("V_in"),
        Varies("V_close"),
        Varies("I_load"),
    ),
    draws=100,
)

WORST_HEAT = WorstCase(
    "E_charge",
    f"C_bank*{_SHARE}*{_TOP}*(2*k_peak*V_in-1.5*{_TOP})+(k_peak*V_in-{_TOP})^2*t_out_hi/R_pre",
    (Varies("R_pre"), Varies("C_bank"), Varies("V_in"), Varies("I_load")),
    draws=100,
)

CHECKS = (
    Check(
        "level",
        "Voltage that the bank heads for",
        "V_least",
        "V_close_hi",
        "voltage",
        "It must lie above the highest threshold, or the bypass never closes",
        Sense.AT_LEAST,
    ),
    Check(
        "time",
        "Time to the threshold",
        "t_close_max",
        "t_out_lo",
        "time",
        "The shortest time-out; later the charge is given up",
    ),
    Check(
        "first_current",
        "First current",
        "I_first",
        "I_allow",
        "current",
        "Making current of contactor, fuse and rectifier; data sheets",
    ),
    Check(
        "energy",
        "Energy of one charge",
        "E_charge_max",
        "E_allow",
        "energy",
        "Pulse energy of the resistor's data sheet, derated",
    ),
    Check(
        "short",
        "Energy with a shorted bank",
        "E_short",
        "E_allow",
        "energy",
        "Pulse energy of the data sheet, derated: the resistor must outlast the time-out",
    ),
    Check(
        "power",
        "Mean power",
        "P_most",
        "P_allow",
        "power",
        "Rated power of the resistor's data sheet, derated",
    ),
    Check(
        "step",
        "Current step at the bypass",
        "I_close",
        "I_step",
        "current",
        "Surge rating of rectifier, contactor and fuse; data sheets",
    ),
)

HAZARDS = (
    Hazard(
        "Charge stops short of the threshold",
        "V_least<=V_close_hi",
        "The load lets the bank rise to {V_least} only: the bypass never closes, and the resistor "
        "carries the load until the time-out.",
    ),
    Hazard(
        "Threshold close to the end of the charge",
        "AND(V_least>V_close_hi,V_least<1.05*V_close_hi)",
        "The bank heads for {V_least}, less than a twentieth above the threshold: the time grows "
        "fast with a little more load or a little less supply.",
    ),
    Hazard(
        "Second try on a shorted bank",
        "2*E_short>E_allow",
        "A shorted bank puts {P_short} on the resistor, {E_short} until the time-out. Two tries in "
        "a row exceed its pulse energy: lock out after the first.",
    ),
    Hazard(
        "Threshold far below the peak",
        "V_close_lo<0.75*V_peak",
        "The bypass closes with a quarter of the voltage or more still missing: the bank takes "
        "{I_close} through contacts and rectifier.",
    ),
)

CURVE = Curve(
    end="MAX(1.2*t_out_hi,4*tau)",
    time_unit="s",
    quantity="voltage",
    unit="V",
    y_title="voltage of the bank",
    caption="Supply on at 0, the bank empty before it, no bypass drawn. Slowest: R_pre, C_bank and "
    "I_load at their highest, V_in at its lowest.",
    traces=(
        Trace("slowest", "FO_STEP(t,tau_late,0,V_least)"),
        Trace("nominal", "FO_STEP(t,tau,0,V_end)"),
    ),
    levels=(Level("threshold, highest", "V_close_hi"),),
    moments=(Moment("time-out, shortest", "t_out_lo"),),
    marks=(Mark("threshold reached, slowest", "t_close_max", "V_close_hi"),),
)

CAUTIONS = (
    Caution(
        "A charged bank looks like an empty one",
        "The bank is charged within seconds of switching on and stays charged after a failed "
        "pre-charge. Isolate, lock off, wait the stated time, prove the voltmeter, measure, short "
        "and earth before touching.",
    ),
    Caution(
        "Lock out at the time-out, never close",
        "A time-out means that the bank is shorted, loaded or disconnected. A bypass closed on it "
        "welds contacts and bursts fuses. Open the supply, and let nobody try again before the "
        "cause is found.",
    ),
    Caution(
        "A bypass that stays shut",
        "A welded bypass takes the pre-charge away: the next closing of the supply meets the empty "
        "bank with nothing but the path. Supervise the bypass contact before each charge.",
    ),
    Caution(
        "A fault burns the resistor",
        "With a shorted bank it takes the full voltage. Choose one that fails without fire, give "
        "it a fuse or a thermal switch that breaks d.c., and mount it away from cables.",
    ),
    Caution(
        "Stored energy",
        "A short on a charged bank bursts conductors and blinds. Discharge through a resistor "
        "first; short only what has been measured as discharged.",
    ),
)

BASIS = Basis(
    method=(
        "Step response of one resistance and one capacitance, the load turned into its equivalent: "
        "final value (V - I_load R_pre) R_par / (R_par + R_pre), time constant C_bank times R_pre "
        "beside R_par.",
        "A rectified line is taken as d.c. For current and heat as d.c. at its highest peak, which "
        "is on the safe side. For the time as d.c. at its lowest mean value: near the peak the "
        "rectifier lets more through than that, so the bank is charged sooner. The peak would "
        "give too short a time.",
        "The heat counts the charge to its end and the load until the time-out, so it holds "
        "however late the bypass closes. It is an upper bound.",
        "Every check takes the worst corner of the tolerances.",
    ),
    assumptions=(
        "The bank is empty at first; a rest of charge lowers time, current and heat.",
        "The load draws its current from the first moment, which lengthens the time. A load at "
        "constant power must not start before the bypass has closed: it draws most at low voltage.",
        "Source and line have no resistance while the bank charges, nor inductance: both would "
        "lower the currents. The time-out opens the supply.",
        "Pulse energy holds from working temperature and for pulses as short as the time constant; "
        "for longer ones a resistor stands more.",
        "The parts vary independently within their limits and do not change with voltage.",
    ),
    sources=(
        "Mean of a six-pulse rectifier, 3 sqrt(2) / pi times the line voltage; half of C V^2 lost "
        "in the resistor of a charge without load: closed form.",
        "Ratings: data sheets named beside the inputs. Checking a shorted bank until the "
        "time-out: common practice.",
    ),
    not_covered=(
        "Single-phase lines, which charge in short pulses and take several times as long; voltage "
        "rating of the resistor; resistors that change with temperature (PTC, NTC); charging "
        "through a controlled rectifier; overshoot by line inductance after the bypass has closed.",
    ),
)

SHEET = Sheet(
    name="precharge",
    title="Pre-charge of a capacitor bank",
    question="how long, how hot and how hard is the pre-charge of a capacitor bank?",
    purpose="To show that the bank is charged through the resistor before the time-out, that the "
    "resistor survives it, a shorted bank included, and that the bypass closes on a current that "
    "contacts and rectifier stand.",
    picture=Picture(
        "precharge.png",
        "The supply closes at t = 0 on the empty bank. The bypass closes over R_pre when the bank "
        "has reached V_close; if that has not happened by t_out, the supply opens.",
    ),
    groups=(SUPPLY, BANK, RESISTOR, BYPASS),
    blocks=(LEVELS, CHARGE, HEAT),
    worst_cases=(WORST_TIME, WORST_HEAT),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-002",
        "Hoist drive, d.c. link: pre-charge",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
)
"""The calc sheet."""
