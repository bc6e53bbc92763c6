"""Does the capacitor bank fall to a safe voltage in time, through the resistors chosen?

A bank of n_s levels in series, each of n_p capacitors in parallel; n_rp chains of n_rs resistors,
across the whole bank or tapped at every level. The engineer says how many chains (0 or 1) are
assumed failed open; every check is made with that many missing, at the worst of the tolerances.
"""

from __future__ import annotations

from tausheet.functions.parts import SERIES
from tausheet.templates import limits
from tausheet.templates.model import (
    COUNT,
    Basis,
    Block,
    Caution,
    Check,
    Choice,
    Column,
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
    Table,
    Tolerance,
    Trace,
    Varies,
    WorstCase,
)

OWN = f'limit="{limits.OWN}"'

BANK = Group(
    "Capacitor bank",
    (
        Input(
            "C_unit",
            "capacitance of one capacitor",
            "capacitance",
            ("mF", "uF", "nF", "F"),
            1e-9,
            10.0,
            "a bank needing a discharge resistor is made of units between these",
            Demo("4.7 mF", "capacitor data sheet, 20 C, 100 Hz", "-20 %", "20 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "n_s",
            "levels in series",
            COUNT,
            (),
            1,
            100,
            "a bank has at least one level, and more than 100 is a slip",
            Demo("2", "schematic of the d.c. link"),
        ),
        Input(
            "n_p",
            "capacitors in parallel on each level",
            COUNT,
            (),
            1,
            1000,
            "a level has at least one capacitor, and more than 1000 is a slip",
            Demo("2", "schematic of the d.c. link"),
        ),
        Input(
            "V_cap",
            "rated voltage of one capacitor",
            "voltage",
            ("V", "kV"),
            1.0,
            20e3,
            "no single capacitor of such a bank is rated outside this",
            Demo("450 V", "capacitor data sheet"),
        ),
        Input(
            "I_leak",
            "leakage current of one capacitor, at working voltage and temperature",
            "current",
            ("mA", "uA", "nA", "A"),
            0.0,
            1.0,
            "it flows out of the capacitor at rest, and 1 A would destroy it",
            Demo("1 mA", "capacitor data sheet, 85 C, after 5 min", "0.2 mA", "2 mA"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "k_back",
            "share of the voltage that returns by dielectric absorption",
            "ratio",
            ("%",),
            0.0,
            0.5,
            "no dielectric gives back more than half",
            Demo("10 %", "common practice for aluminium electrolytics"),
        ),
    ),
)

VOLTAGE = Group(
    "Voltage when the supply is switched off",
    (
        Input(
            "V_start",
            "voltage of the bank at switching off",
            "voltage",
            ("V", "kV"),
            1.0,
            50e3,
            "below there is nothing to discharge, above it takes more than a resistor",
            Demo(
                "565 V",
                "400 V mains; highest: braking chopper switches on at 680 V",
                "510 V",
                "680 V",
            ),
            Tolerance.ABSOLUTE,
            (
                Rule(
                    "V_start>V_safe",
                    "is not above the safe voltage, so there is nothing to discharge: "
                    "look for a slip in the unit",
                ),
                Rule(
                    f"IF({OWN},TRUE,AND(V_start_hi>=INDEX(limit_lowest,MATCH(limit,limit_name,0)),"
                    "V_start_hi<=INDEX(limit_highest,MATCH(limit,limit_name,0))))",
                    "has a highest value for which the chosen limit is not meant: "
                    "pick another limit, part 10 says which is for what",
                ),
            ),
        ),
    ),
)

RESISTORS = Group(
    "Discharge resistors",
    (
        Input(
            "R_unit",
            "resistance of one resistor",
            "resistance",
            ("kohm", "ohm", "Mohm"),
            0.1,
            1e9,
            "no discharge resistor lies outside this",
            Demo("30 kohm", "resistor data sheet, 5 % with temperature and ageing", "-5 %", "5 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "n_rs",
            "resistors in series in each chain",
            COUNT,
            (),
            1,
            1000,
            "a chain has at least one resistor, and more than 1000 is a slip",
            Demo("2", "schematic of the d.c. link"),
            rules=(
                Rule(
                    'IF(tapped="yes",MOD(n_rs,n_s)=0,TRUE)',
                    "cannot be shared out among the levels: with taps it is a multiple of n_s",
                ),
            ),
        ),
        Input(
            "n_rp",
            "chains in parallel",
            COUNT,
            (),
            1,
            1000,
            "there is at least one chain, and more than 1000 is a slip",
            Demo("4", "schematic of the d.c. link"),
        ),
        Choice(
            "tapped",
            "chains tapped at every level, sharing the voltage out",
            ("yes", "no"),
            Demo("yes", "schematic of the d.c. link"),
        ),
        Input(
            "n_open",
            "resistors assumed failed open",
            COUNT,
            (),
            0,
            1,
            "the sheet reckons with no failure or with one",
            Demo("1", "safety requirements of the drive retrofit"),
        ),
        Input(
            "P_rated",
            "rated power of one resistor",
            "power",
            ("W", "mW", "kW"),
            1e-3,
            100e3,
            "no single discharge resistor is rated outside this",
            Demo("25 W", "resistor data sheet, free air"),
        ),
        Input(
            "T_full",
            "ambient up to which the full power holds",
            "temperature",
            ("degC",),
            -40.0,
            200.0,
            "the derating of a resistor starts between these",
            Demo("25 degC", "resistor data sheet, derating line"),
        ),
        Input(
            "T_zero",
            "ambient at which no power is left",
            "temperature",
            ("degC",),
            50.0,
            500.0,
            "the derating of a resistor ends between these",
            Demo("250 degC", "resistor data sheet, derating line"),
            rules=(Rule("T_zero>T_full", "is not above T_full: the derating line must fall"),),
        ),
        Input(
            "T_amb",
            "ambient temperature at the resistors",
            "temperature",
            ("degC",),
            -60.0,
            200.0,
            "no cabinet is colder or hotter",
            Demo("40 degC", "cabinet heat run of the drive retrofit", "-10 degC", "55 degC"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "V_rated",
            "rated voltage of one resistor (limiting element voltage)",
            "voltage",
            ("V", "kV"),
            1.0,
            50e3,
            "no single discharge resistor is rated outside this",
            Demo("500 V", "resistor data sheet"),
        ),
        Choice(
            "series",
            "preferred numbers to choose a resistance from",
            ("E12", "E24", "E96"),
            Demo("E24", "stock list of the workshop"),
        ),
    ),
)

LIMIT = Group(
    "Safe voltage and time",
    (
        Choice(
            "limit",
            "limit that applies",
            limits.names(),
            Demo(
                limits.OWN,
                "5 s cannot be met, so the door carries a notice with the time "
                "(IEC 60204-1, 6.2.4; from memory)",
            ),
        ),
        Input(
            "V_own",
            "own limit: safe voltage",
            "voltage",
            ("V",),
            1.0,
            120.0,
            "more than 120 V d.c. is safe nowhere (IEC 61140, from memory)",
            Demo("60 V", "IEC 60204-1, 6.2.4"),
            needed=OWN,
        ),
        Input(
            "t_own",
            "own limit: time after switching off",
            "time",
            ("s", "min", "h"),
            0.1,
            3600.0,
            "nobody waits longer than an hour",
            Demo("5 min", "notice on the cabinet door"),
            needed=OWN,
        ),
    ),
)

_PATH_HI = "R_unit_hi*n_rs/(n_rp-n_open)"
_BANK_HI = "C_unit_hi*n_p/n_s"

SETTING = Block(
    "Limit",
    (
        Quantity(
            "V_safe",
            "safe voltage",
            f"IF({OWN},V_own,INDEX(limit_voltage,MATCH(limit,limit_name,0)))",
            "voltage",
            "from the list of limits (part 10), or the own limit",
        ),
        Quantity(
            "t_limit",
            "time allowed",
            f"IF({OWN},t_own,INDEX(limit_time,MATCH(limit,limit_name,0)))",
            "time",
            "from the list of limits (part 10), or the own limit",
        ),
    ),
)

DISCHARGE = Block(
    "Discharge, with n_open chains missing",
    (
        Quantity(
            "C_bank",
            "capacitance of the bank",
            "C_unit*n_p/n_s",
            "capacitance",
            "C_bank = C_unit n_p / n_s",
        ),
        Quantity(
            "R_path",
            "resistance of the discharge path",
            "R_unit*n_rs/(n_rp-n_open)",
            "resistance",
            "R_path = R_unit n_rs / (n_rp - n_open): an open resistor takes its chain away; with "
            "taps only that of its level, so this is on the safe side",
        ),
        Quantity(
            "tau",
            "time constant, nominal",
            "FO_TAU_RC(R_path,C_bank)",
            "time",
            "tau = R_path C_bank",
        ),
        Quantity(
            "tau_hi",
            "time constant, worst case",
            f"FO_TAU_RC({_PATH_HI},{_BANK_HI})",
            "time",
            "tau_hi = R_path C_bank with R_unit and C_unit at their highest",
        ),
        Quantity(
            "t_safe",
            "time to the safe voltage, nominal",
            "FO_TIME_UNTIL_BELOW(V_safe,tau,V_start,0)",
            "time",
            "t_safe = tau ln(V_start / V_safe)",
            "MAX(0,R_unit*n_rs/(n_rp-n_open)*C_unit*n_p/n_s*LN(V_start/V_safe))",
        ),
        Quantity(
            "V_left",
            "voltage left at the time allowed, worst case",
            "FO_NATURAL(t_limit,tau_hi,V_start_hi)",
            "voltage",
            "V_left = V_start,hi exp(-t_limit / tau_hi)",
            f"V_start_hi*EXP(-t_limit/({_PATH_HI}*{_BANK_HI}))",
        ),
        Quantity(
            "t_sound",
            "time with every resistor sound, worst case",
            f"FO_TIME_UNTIL_BELOW(V_safe,FO_TAU_RC(R_unit_hi*n_rs/n_rp,{_BANK_HI}),V_start_hi,0)",
            "time",
            "as t_safe, with n_open = 0 and every tolerance at its worst",
        ),
        Quantity(
            "t_open",
            "time with one resistor failed open, worst case",
            f"FO_TIME_UNTIL_BELOW(V_safe,FO_TAU_RC(R_unit_hi*n_rs/(n_rp-1),{_BANK_HI}),"
            "V_start_hi,0)",
            "time",
            "as t_safe, with n_open = 1 and every tolerance at its worst; no result for a single "
            "chain, since the bank then never discharges",
        ),
        Quantity(
            "E_bank",
            "stored energy, highest",
            f"FO_ENERGY_C({_BANK_HI},V_start_hi)",
            "energy",
            "E_bank = C_bank V_start^2 / 2, both at their highest",
            f"{_BANK_HI}*V_start_hi^2/2",
        ),
        Quantity(
            "Q_bank",
            "stored charge, highest",
            f"{_BANK_HI}*V_start_hi",
            "charge",
            "Q_bank = C_bank V_start, both at their highest; IEC 60204-1 asks nothing at 60 µC or "
            "less (from memory), which is not used here",
        ),
    ),
)

CHOICE = Block(
    "Choice of the resistance",
    (
        Quantity(
            "tau_max",
            "largest allowed time constant",
            "FO_TAU_FOR(V_safe,t_limit,V_start_hi,0)",
            "time",
            "tau_max = t_limit / ln(V_start,hi / V_safe)",
            "t_limit/LN(V_start_hi/V_safe)",
        ),
        Quantity(
            "R_max",
            "largest allowed nominal resistance of one resistor",
            f"tau_max/({_BANK_HI})*(n_rp-n_open)/n_rs*R_unit/R_unit_hi",
            "resistance",
            "R_max = tau_max / C_bank,hi x (n_rp - n_open) / n_rs x R_unit / R_unit,hi, so that "
            "R_unit with its tolerance keeps the time",
            "t_limit/LN(V_start_hi/V_safe)*n_s*(n_rp-n_open)*R_unit/(C_unit_hi*n_p*n_rs*R_unit_hi)",
        ),
        Quantity(
            "R_pref",
            "preferred value at or under it",
            'FO_PREFERRED(R_max,series,"down")',
            "resistance",
            "the next number of the series at or below R_max; the second way looks it up in the "
            "worksheet Tables",
            "10^INT(LOG10(R_max_hand))*IF("
            + ",IF(".join(
                f'series="{name}",INDEX(series_{name},MATCH(ROUND(R_max_hand/'
                f"10^INT(LOG10(R_max_hand)),11),series_{name},1))"
                for name in ("E12", "E24", "E96")
            )
            + ",NA())))",
        ),
    ),
)

SHARING = Block(
    "Voltage of each capacitor, worst case",
    (
        Quantity(
            "V_by_C",
            "by unequal capacitance, just after charging",
            "V_start_hi*C_unit_hi/(C_unit_hi+(n_s-1)*C_unit_lo)",
            "voltage",
            "charge is common to all levels: the smallest level takes V_start C_hi / (C_hi + "
            "(n_s - 1) C_lo)",
            "V_start_hi-(n_s-1)*(V_start_hi*C_unit_lo/(C_unit_hi+(n_s-1)*C_unit_lo))",
        ),
        Quantity(
            "R_level_hi",
            "resistance across the level with the missing chain, highest",
            "R_unit_hi*n_rs/n_s/(n_rp-n_open)",
            "resistance",
            "R_level,hi = R_unit,hi (n_rs / n_s) / (n_rp - n_open); used with taps only",
        ),
        Quantity(
            "R_level_lo",
            "resistance across every other level, lowest",
            "R_unit_lo*n_rs/n_s/n_rp",
            "resistance",
            "R_level,lo = R_unit,lo (n_rs / n_s) / n_rp; used with taps only",
        ),
        Quantity(
            "I_dif",
            "difference of leakage between levels, highest",
            "n_p*(I_leak_hi-I_leak_lo)",
            "current",
            "I_dif = n_p (I_leak,hi - I_leak,lo)",
        ),
        Quantity(
            "V_by_leak",
            "by unequal leakage and resistance, after long standing",
            'IF(n_s=1,V_start_hi,IF(tapped="yes",MIN(V_start_hi,R_level_hi*(V_start_hi+(n_s-1)'
            "*R_level_lo*I_dif)/(R_level_hi+(n_s-1)*R_level_lo)),IF(I_leak_hi>0,V_start_hi"
            "*I_leak_hi/(I_leak_hi+(n_s-1)*I_leak_lo),V_start_hi)))",
            "voltage",
            "with taps: R_hi (V_start + (n_s - 1) R_lo I_dif) / (R_hi + (n_s - 1) R_lo), at most "
            "V_start; without: V_start I_hi / (I_hi + (n_s - 1) I_lo)",
            'IF(n_s=1,V_start_hi,IF(tapped="yes",MIN(V_start_hi,((V_start_hi+R_level_hi*n_p'
            "*I_leak_lo+(n_s-1)*R_level_lo*n_p*I_leak_hi)/(R_level_hi+(n_s-1)*R_level_lo)"
            "-n_p*I_leak_lo)*R_level_hi),IF(I_leak_hi>0,V_start_hi/(1+(n_s-1)*I_leak_lo"
            "/I_leak_hi),V_start_hi)))",
        ),
        Quantity(
            "V_level",
            "highest voltage of a capacitor",
            "MAX(V_by_C,V_by_leak)",
            "voltage",
            "the larger of the two: the one passes into the other while the bank stands",
            "MAX(V_by_C_hand,V_by_leak_hand)",
        ),
        Quantity(
            "V_fail",
            "the same with one resistor failed open",
            'IF(OR(n_s=1,tapped="no"),V_level,IF(n_rp=1,V_start_hi,MAX(V_by_C,MIN(V_start_hi,'
            "R_unit_hi*n_rs/n_s/(n_rp-1)*(V_start_hi+(n_s-1)*R_level_lo*I_dif)"
            "/(R_unit_hi*n_rs/n_s/(n_rp-1)+(n_s-1)*R_level_lo)))))",
            "voltage",
            "with taps, R_level,hi with n_open = 1; all of V_start where that was the only chain",
        ),
    ),
)

LOAD = Block(
    "Load of the resistors while the bank is energized, worst case",
    (
        Quantity(
            "n_chain",
            "resistors that share one voltage",
            'IF(tapped="yes",n_rs/n_s,n_rs)',
            COUNT,
            "n_rs / n_s with taps, n_rs without",
        ),
        Quantity(
            "V_chain",
            "voltage that they share",
            'IF(tapped="yes",V_level,V_start_hi)',
            "voltage",
            "the highest voltage of a level with taps, of the bank without",
        ),
        Quantity(
            "V_res",
            "voltage of one resistor",
            "V_chain*R_unit_hi/(R_unit_hi+(n_chain-1)*R_unit_lo)",
            "voltage",
            "one resistor at its highest, the others of the chain at their lowest",
            "V_chain-(n_chain-1)*(V_chain*R_unit_lo/(R_unit_hi+(n_chain-1)*R_unit_lo))",
        ),
        Quantity(
            "R_hot",
            "resistance at which one resistor takes most",
            "MIN(R_unit_hi,MAX(R_unit_lo,(n_chain-1)*R_unit_lo))",
            "resistance",
            "power is greatest where it matches the rest of the chain, (n_chain - 1) R_lo, within "
            "its own limits",
        ),
        Quantity(
            "P_res",
            "power of one resistor",
            "V_chain^2*R_hot/(R_hot+(n_chain-1)*R_unit_lo)^2",
            "power",
            "P_res = V_chain^2 R_hot / (R_hot + (n_chain - 1) R_lo)^2; the second way takes the "
            "greatest of the candidates",
            "V_chain^2*MAX(R_unit_lo/(n_chain*R_unit_lo)^2,R_unit_hi/(R_unit_hi+(n_chain-1)"
            "*R_unit_lo)^2,IF(AND((n_chain-1)*R_unit_lo>R_unit_lo,(n_chain-1)*R_unit_lo<R_unit_hi),"
            "1/(4*MAX(1,n_chain-1)*R_unit_lo),0))",
        ),
        Quantity(
            "P_allow",
            "power allowed for one resistor at the highest ambient",
            "P_rated*MAX(0,MIN(1,(T_zero-T_amb_hi)/(T_zero-T_full)))",
            "power",
            "P_allow = P_rated (T_zero - T_amb,hi) / (T_zero - T_full), from 0 to P_rated",
        ),
        Quantity(
            "P_bank",
            "power of all resistors",
            "V_start_hi^2/(R_unit_lo*n_rs/n_rp)",
            "power",
            "P_bank = V_start,hi^2 / R with every resistor sound and at its lowest",
            "V_start_hi/n_rs*(V_start_hi/(n_rs*R_unit_lo))*n_rs*n_rp",
        ),
        Quantity(
            "T_res",
            "surface temperature of the hottest resistor, estimated",
            "T_amb_hi+P_res*(T_zero-T_full)/P_rated",
            "temperature",
            "T_res = T_amb,hi + P_res (T_zero - T_full) / P_rated: the slope of the derating line "
            "taken as the thermal resistance",
        ),
        Quantity(
            "V_back",
            "voltage that may return once the resistors are disconnected",
            "k_back*V_start_hi",
            "voltage",
            "V_back = k_back V_start,hi",
        ),
    ),
)

WORST = WorstCase(
    "t_safe",
    "FO_TIME_UNTIL_BELOW(V_safe,FO_TAU_RC(R_unit*n_rs/(n_rp-n_open),C_unit*n_p/n_s),V_start,0)",
    (Varies("R_unit"), Varies("C_unit"), Varies("V_start")),
)

CHECKS = (
    Check(
        "time",
        "Time to the safe voltage",
        "t_safe_max",
        "t_limit",
        "time",
        "Limit: {limit}; reckoned with n_open = {n_open}. Confirm against the edition in force.",
    ),
    Check(
        "power",
        "Power of one resistor",
        "P_res",
        "P_allow",
        "power",
        "Derating line of the resistor's data sheet, at the highest ambient",
    ),
    Check(
        "resistor_voltage",
        "Voltage of one resistor",
        "V_res",
        "V_rated",
        "voltage",
        "Limiting element voltage of the resistor's data sheet",
    ),
    Check(
        "capacitor_voltage",
        "Voltage of one capacitor",
        "V_level",
        "V_cap",
        "voltage",
        "Rated voltage of the capacitor's data sheet, with unequal sharing over the levels",
    ),
)

HAZARDS = (
    Hazard(
        "One resistor failed open",
        "AND(n_open=0,IF(n_rp=1,TRUE,t_open>t_limit))",
        "No failure is assumed. With one open the time is {t_open}, not the time allowed; a single "
        "chain never discharges the bank.",
    ),
    Hazard(
        "Capacitor over its rating",
        "V_fail>V_cap",
        "With one resistor open a capacitor may stand at {V_fail}, above its rating.",
    ),
    Hazard(
        "Unequal sharing",
        "AND(n_s>1,V_level>1.1*V_start_hi/n_s)",
        "Tolerance and leakage put {V_level} on one capacitor where an equal share is less by more "
        "than a tenth.",
    ),
    Hazard(
        "Charge trapped inside",
        'AND(n_s>1,tapped="no")',
        "Without taps a capacitor can stay charged while the terminals of the bank read zero: "
        "short every level before touching it.",
    ),
    Hazard(
        "Rebound",
        "V_back>V_safe",
        "After the resistors are disconnected the voltage may come back to {V_back}, above the "
        "safe voltage: keep a short in place while working.",
    ),
    Hazard(
        "Hot surface",
        "T_res>60",
        "The hottest resistor reaches about {T_res}: guard it, and keep cables and hands away.",
    ),
)

CURVE = Curve(
    end="MAX(t_limit,t_safe_max)",
    time_unit="s",
    quantity="voltage",
    unit="V",
    y_title="voltage of the bank",
    caption="Supply off at 0. Worst case: R_unit, C_unit and V_start at their highest, n_open "
    "chains missing. Before 0 the bank stands at its start voltage.",
    traces=(
        Trace("worst case", "FO_NATURAL(t,tau_hi,V_start_hi)"),
        Trace("nominal", "FO_NATURAL(t,tau,V_start)"),
    ),
    levels=(Level("safe voltage", "V_safe"),),
    moments=(Moment("time allowed", "t_limit"),),
    marks=(Mark("safe, worst case", "t_safe_max", "V_safe"),),
)

CAUTIONS = (
    Caution(
        "Resistors fail open, and nobody sees it",
        "A discharge resistor that has failed looks like a sound one, and the bank keeps its full "
        "voltage. A calculated time is never a reason to touch: the bank is safe when it has been "
        "measured, not when the time is over.",
    ),
    Caution(
        "Prove dead before touching",
        "Isolate, lock off, wait the stated time, prove the voltmeter on a live source, measure "
        "every level and pole to earth, prove the voltmeter again, then short and earth.",
    ),
    Caution(
        "The charge comes back",
        "Dielectric absorption restores part of the voltage after the resistors or the short are "
        "taken away, over minutes to days. Keep a short in place while working, and store loose "
        "capacitors shorted.",
    ),
    Caution(
        "Stored energy",
        "A short on a charged bank bursts conductors and blinds. Discharge through a resistor "
        "first; short only what has been measured as discharged.",
    ),
    Caution(
        "The supply must be off",
        "The time counts from the moment the last supply is off: mains, pre-charge, a second "
        "rectifier on the same link, a motor that is still turning and feeds back.",
    ),
    Caution(
        "Hot resistors",
        "They carry power whenever the bank is energized and stay hot after it. Mount them away "
        "from capacitors and cables, and guard them against touch.",
    ),
)

BASIS = Basis(
    method=(
        "Natural response of one resistance and one capacitance: V(t) = V_start exp(-t / (R C)). "
        "Every check takes the worst corner of the tolerances, with n_open chains missing.",
        "With taps the levels discharge side by side, each with its own time constant; the slowest "
        "is taken for all, which is on the safe side. Leakage hastens the discharge and is left "
        "out, which is on the safe side too.",
        "Sharing among levels: just after charging by capacitance, after long standing by leakage "
        "current and by the resistors; the larger of the two is checked.",
    ),
    assumptions=(
        "Supply and load are off from t = 0, and the resistors stay connected.",
        "Each level is made of n_p capacitors joined in parallel. With taps, n_rp chains of "
        "n_rs / n_s resistors lie across each level.",
        "Capacitance and resistance do not change with voltage; their tolerances cover temperature "
        "and ageing. The parts vary independently within their limits.",
        "While energized the bank stands at the highest start voltage without end.",
    ),
    sources=(
        "Limits: list below, each from memory unless it says otherwise; confirm against the "
        "edition in force.",
        "Preferred numbers: IEC 60063. Unequal sharing, derating line and dielectric absorption of "
        "aluminium electrolytics (about 10 %): common practice.",
    ),
    not_covered=(
        "Ripple current, capacitor life, pulse load of the resistors at switching on, insulation "
        "of the resistors to earth, discharge by a switched resistor, and shared-charge rules "
        "(50 or 60 µC) for small banks.",
    ),
)

SHEET = Sheet(
    name="bleed",
    title="Discharge of a capacitor bank",
    question="does the capacitor bank fall to a safe voltage in time, through the resistor chosen?",
    purpose="To show that the capacitor bank falls to a safe voltage in the time allowed once the "
    "supply is off, and that resistors and capacitors stay within their ratings while it is on.",
    picture=Picture(
        "bleed.png",
        "The supply opens at t = 0. The bank, at V_start, discharges through the resistors, which "
        "stay connected. Drawn with n_s = 2 and taps; without taps the middle link is absent.",
    ),
    groups=(BANK, VOLTAGE, RESISTORS, LIMIT),
    blocks=(SETTING, DISCHARGE, CHOICE, SHARING, LOAD),
    worst_cases=(WORST,),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-001",
        "Hoist drive, d.c. link: discharge",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
    tables=(
        limits.as_table(),
        Table(
            "series",
            "Preferred numbers of one decade (IEC 60063)",
            tuple(
                Column(name, name, tuple(number / 100 for number in SERIES[name]))
                for name in ("E12", "E24", "E96")
            ),
        ),
    ),
)
"""The calc sheet."""
