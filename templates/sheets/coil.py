"""How fast does a relay, valve or brake coil pull in and let go, and what does its suppressor see?

Pulling in: the gap is open, the coil hot and the supply low. Letting go: the gap is closed, which
has more inductance, and the current goes on through the suppressor until it is zero; it does not
reverse there.
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

ZENER = 'suppressor="diode + Zener"'
RESISTOR = 'suppressor="resistor"'
DIODE = 'OR(suppressor="diode",suppressor="diode + Zener")'

COIL = Group(
    "Coil",
    (
        Input(
            "R_cu",
            "resistance at 20 °C (copper)",
            "resistance",
            ("ohm", "kohm", "mohm"),
            1e-3,
            1e7,
            "no such coil lies outside this",
            Demo("96 ohm", "brake data sheet", "-5 %", "5 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "T_coil",
            "temperature of the winding; lowest: cold start, highest: in service",
            "temperature",
            ("degC",),
            -60.0,
            250.0,
            "no winding is colder or hotter",
            Demo("60 degC", "brake data sheet, class F; site data", "-20 degC", "115 degC"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "L_open",
            "inductance with the gap open",
            "inductance",
            ("H", "mH", "uH"),
            1e-7,
            1e4,
            "no such coil lies outside this",
            Demo("6 H", "brake data sheet", "-10 %", "10 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "L_shut",
            "inductance with the gap closed",
            "inductance",
            ("H", "mH", "uH"),
            1e-7,
            1e4,
            "no such coil lies outside this",
            Demo("9.5 H", "brake data sheet", "-10 %", "10 %"),
            Tolerance.PERCENT,
            (Rule("L_shut>=L_open", "is below L_open: closing the gap raises the inductance"),),
        ),
        Input(
            "I_pull",
            "pull-in current",
            "current",
            ("A", "mA", "uA"),
            1e-6,
            1e4,
            "no such coil pulls in outside this",
            Demo("0.9 A", "type test of the brake", "0.75 A", "1 A"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "I_drop",
            "drop-out current",
            "current",
            ("A", "mA", "uA"),
            1e-6,
            1e4,
            "no such coil drops out outside this",
            Demo("0.35 A", "type test of the brake", "0.25 A", "0.45 A"),
            Tolerance.ABSOLUTE,
            (Rule("I_drop_hi<I_pull_lo", "is not always below I_pull: it would chatter"),),
        ),
    ),
)

SUPPLY = Group(
    "Supply and suppressor",
    (
        Input(
            "V_sup",
            "supply of the coil",
            "voltage",
            ("V", "kV", "mV"),
            0.1,
            2e4,
            "no such coil is fed from outside this",
            Demo("205 V", "rectified control supply", "184 V", "226 V"),
            Tolerance.ABSOLUTE,
        ),
        Choice(
            "suppressor",
            "suppressor across the coil",
            ("diode", "diode + Zener", "resistor"),
            Demo("diode + Zener", "schematic of the brake supply"),
        ),
        Input(
            "V_fwd",
            "forward voltage of the diode",
            "voltage",
            ("V", "mV"),
            0.0,
            5.0,
            "no diode drops more",
            Demo("0.8 V", "diode data sheet, at small current", "0.6 V", "1.1 V"),
            Tolerance.ABSOLUTE,
            needed=DIODE,
        ),
        Input(
            "V_zen",
            "Zener voltage",
            "voltage",
            ("V",),
            0.5,
            2e3,
            "no Zener or avalanche diode lies outside this",
            Demo("200 V", "avalanche diode data sheet", "190 V", "220 V"),
            Tolerance.ABSOLUTE,
            needed=ZENER,
        ),
        Input(
            "R_sup",
            "suppressor resistance",
            "resistance",
            ("ohm", "kohm", "Mohm"),
            1e-3,
            1e9,
            "no suppressor resistor lies outside this",
            Demo("", ""),
            Tolerance.PERCENT,
            needed=RESISTOR,
        ),
        Input(
            "n_op",
            "operations, highest rate",
            "rate of operation",
            ("1/h", "1/min", "1/s"),
            1e-6,
            1e3,
            "nothing mechanical operates more often",
            Demo("240 1/h", "duty of the crane"),
        ),
    ),
)

LIMITS = Group(
    "What is asked for, and what the parts stand",
    (
        Input(
            "t_in",
            "time allowed to pull in",
            "time",
            ("ms", "s", "us"),
            1e-6,
            100.0,
            "no such device is given longer",
            Demo("150 ms", "start of the hoist: brake open before torque"),
        ),
        Input(
            "t_out",
            "time allowed to let go",
            "time",
            ("ms", "s", "us"),
            1e-6,
            100.0,
            "no such device is given longer",
            Demo("120 ms", "stopping distance of the hoist"),
        ),
        Input(
            "V_sw",
            "voltage that the switch stands",
            "voltage",
            ("V", "kV"),
            0.1,
            1e5,
            "no switch of such a coil is rated outside this",
            Demo("600 V", "contact and transistor data sheets"),
        ),
        Input(
            "E_sup",
            "energy that the suppressor takes in one operation",
            "energy",
            ("J", "mJ", "kJ"),
            1e-9,
            1e6,
            "no suppressor takes less or more",
            Demo("40 J", "avalanche diode data sheet, 10 ms pulses and longer"),
        ),
        Input(
            "P_sup",
            "power that it stands for long",
            "power",
            ("W", "mW", "kW"),
            1e-6,
            1e6,
            "no suppressor is rated outside this",
            Demo("5 W", "avalanche diode data sheet, on its heat sink at 55 °C"),
        ),
    ),
)


def _clamp(end: str) -> str:
    diode = f"V_fwd{end}"
    return f"IF({RESISTOR},0,IF({ZENER},{diode}+V_zen{end},{diode}))"


PARTS = Block(
    "Coil and suppressor at their extremes",
    (
        Quantity(
            "R_hot",
            "resistance of the coil, highest",
            "FO_RESISTANCE_AT(R_cu_hi,T_coil_hi)",
            "resistance",
            "R = R_cu (1 + 0.00393 (T - 20)), copper (IEC 60028)",
            "R_cu_hi*(1+0.00393*(T_coil_hi-20))",
        ),
        Quantity(
            "R_cold",
            "resistance of the coil, lowest",
            "FO_RESISTANCE_AT(R_cu_lo,T_coil_lo)",
            "resistance",
            "the same with both at their lowest",
            "R_cu_lo*(1+0.00393*(T_coil_lo-20))",
        ),
        Quantity(
            "I_hot",
            "current of the hot coil at the lowest supply",
            "V_sup_lo/R_hot",
            "current",
            "I_hot = V_sup,lo / R_hot: below the pull-in current it never pulls in",
        ),
        Quantity(
            "I_cold",
            "current of the cold coil at the highest supply",
            "V_sup_hi/R_cold",
            "current",
            "I_cold = V_sup,hi / R_cold: what the suppressor takes over",
            "V_sup_hi/(R_cu_lo*(1+0.00393*(T_coil_lo-20)))",
        ),
        Quantity(
            "V_slow",
            "constant voltage of the suppressor, lowest",
            _clamp("_lo"),
            "voltage",
            "diode: V_fwd; diode + Zener: V_fwd + V_zen; resistor: 0",
        ),
        Quantity(
            "V_clamp",
            "the same, highest",
            _clamp("_hi"),
            "voltage",
            "with V_fwd and V_zen at their highest",
        ),
        Quantity(
            "R_slow",
            "resistance of the suppressor, lowest",
            f"IF({RESISTOR},R_sup_lo,0)",
            "resistance",
            "resistor: R_sup,lo; else 0",
        ),
        Quantity(
            "R_clamp",
            "the same, highest",
            f"IF({RESISTOR},R_sup_hi,0)",
            "resistance",
            "resistor: R_sup,hi; else 0",
        ),
    ),
)

_COIL = "FO_RESISTANCE_AT(R_cu,T_coil)"
_COIL_BY_HAND = "(R_cu*(1+0.00393*(T_coil-20)))"
_PULL = f"FO_TIME_TO(I_pull,FO_TAU_RL({_COIL},L_open),0,V_sup/{_COIL})"
_LET_GO = (
    f"FO_TIME_UNTIL_BELOW(I_drop,FO_TAU_RL({_COIL}+R_slow,L_shut),V_sup/{_COIL},"
    f"-V_slow/({_COIL}+R_slow))"
)
_LOOP = f"({_COIL_BY_HAND}+R_slow)"

TIMES = Block(
    "Times, nominal",
    (
        Quantity(
            "t_pull",
            "time to pull in",
            _PULL,
            "time",
            "t_pull = L_open / R ln(1 / (1 - I_pull R / V_sup)), from zero",
            f"-L_open/{_COIL_BY_HAND}*LN(1-I_pull*{_COIL_BY_HAND}/V_sup)",
        ),
        Quantity(
            "t_rel",
            "time to let go, with the suppressor at its slowest",
            _LET_GO,
            "time",
            "t_rel = L_shut / (R + R_slow) ln((I + I_s) / (I_drop + I_s)), I = V_sup / R, "
            "I_s = V_slow / (R + R_slow)",
            f"MAX(0,L_shut/{_LOOP}*LN((V_sup/{_COIL_BY_HAND}+V_slow/{_LOOP})"
            f"/(I_drop+V_slow/{_LOOP})))",
        ),
    ),
)

STRESS = Block(
    "Suppressor and switch, worst case",
    (
        Quantity(
            "V_peak",
            "voltage of the switch as it opens",
            "V_sup_hi+V_clamp+I_cold*R_clamp",
            "voltage",
            "V_peak = V_sup,hi + V_clamp + I_cold R_clamp",
            "V_sup_hi+V_clamp+V_sup_hi*R_clamp/(R_cu_lo*(1+0.00393*(T_coil_lo-20)))",
        ),
        Quantity(
            "E_coil",
            "energy of the coil, highest",
            "FO_ENERGY_L(L_shut_hi,I_cold)",
            "energy",
            "E_coil = L_shut,hi I_cold^2 / 2",
            "L_shut_hi*I_cold_hand^2/2",
        ),
        Quantity(
            "t_zero",
            "time until its current is zero, where it stays",
            "IF(V_clamp=0,0,FO_TIME_TO(0,FO_TAU_RL(R_cold+R_clamp,L_shut_hi),I_cold,"
            "-V_clamp/(R_cold+R_clamp)))",
            "time",
            "t_zero = tau ln(1 + I_cold (R_cold + R_clamp) / V_clamp); 0 stands for never, with a "
            "resistor alone",
            "IF(V_clamp=0,0,L_shut_hi/(R_cold_hand+R_clamp)*LN(1+I_cold_hand*(R_cold_hand+R_clamp)"
            "/MAX(V_clamp,1E-300)))",
        ),
        Quantity(
            "E_take",
            "of that into the suppressor",
            f"IF({RESISTOR},E_coil*R_clamp/(R_cold+R_clamp),"
            "IF(V_clamp=0,0,V_clamp*t_zero*FO_MEAN(FO_TAU_RL(R_cold,L_shut_hi),I_cold,"
            "clamped,0,t_zero)))",
            "energy",
            "resistor: E_coil R_clamp / (R_cold + R_clamp); else V_clamp times the charge "
            "until the current is zero",
            f"IF({RESISTOR},E_coil_hand*R_clamp/(R_cold_hand+R_clamp),V_clamp*(L_shut_hi*I_cold_hand"
            "-V_clamp*t_zero_hand)/R_cold_hand)",
        ),
        Quantity(
            "P_stay",
            "power of a suppressor resistor while the coil is on",
            f"IF({RESISTOR},V_sup_hi^2/R_sup_lo,0)",
            "power",
            "P_stay = V_sup,hi^2 / R_sup,lo: the supply feeds it too; a diode blocks it, so 0",
        ),
        Quantity(
            "P_take",
            "power of the suppressor at the highest rate",
            "E_take*n_op+P_stay",
            "power",
            "P_take = E_take n_op + P_stay, as if the coil were on without end",
            f"E_take_hand/(1/n_op)+IF({RESISTOR},V_sup_hi/R_sup_lo*V_sup_hi,0)",
        ),
    ),
)

CHECKS = (
    Check(
        "holds",
        "Current of the hot coil at the lowest supply",
        "I_hot",
        "I_pull_hi",
        "current",
        "Pull-in current at its highest: below it the coil never pulls in",
        Sense.AT_LEAST,
    ),
    Check(
        "pull",
        "Time to pull in",
        "t_pull_max",
        "t_in",
        "time",
        "Time allowed; gap open, coil hot, supply low",
    ),
    Check(
        "release",
        "Time to let go",
        "t_rel_max",
        "t_out",
        "time",
        "Time allowed; gap closed, suppressor {suppressor}",
    ),
    Check(
        "voltage",
        "Voltage of the switch",
        "V_peak",
        "V_sw",
        "voltage",
        "Data sheet of the switch",
    ),
    Check(
        "energy",
        "Energy of the suppressor, each operation",
        "E_take",
        "E_sup",
        "energy",
        "Data sheet of the suppressor",
    ),
    Check(
        "power",
        "Power of the suppressor",
        "P_take",
        "P_sup",
        "power",
        "Data sheet of the suppressor, at its ambient",
    ),
)

HAZARDS = (
    Hazard(
        "One inductance for both gaps",
        "L_shut<=1.02*L_open",
        "L_shut is hardly above L_open. A closed gap raises the inductance, by half and more in a "
        "brake: release would be slower than reckoned.",
    ),
    Hazard(
        "Current stops at zero",
        "AND(V_slow>0,I_drop_lo<0.05*I_cold)",
        "The device lets go at nearly zero current. The current stays at zero once it is there; it "
        "does not reverse, whatever voltage the suppressor has.",
    ),
    Hazard(
        "Diode alone",
        'suppressor="diode"',
        "A diode alone lets the current fall with the coil's own time constant: release takes up "
        "to {t_rel_max}. A Zener in series, or a resistor, shortens it.",
    ),
    Hazard(
        "Little reserve to pull in",
        "I_hot<1.2*I_pull_hi",
        "Hot and at the lowest supply the current is {I_hot}, less than a fifth above the pull-in "
        "current: a weaker supply or a hotter coil never pulls in.",
    ),
    Hazard(
        "Operates faster than it settles",
        "(t_pull_max+t_rel_max)*n_op>0.5",
        "Pulling in and letting go take more than half of the time between operations: the current "
        "does not settle, and the coil heats more.",
    ),
)

_SLOW = "L_shut_hi/(R_cold+R_slow)"

CURVE = Curve(
    end="MAX(t_in,t_pull_max,t_out,t_rel_max)",
    time_unit="ms",
    quantity="current",
    unit="A",
    y_title="current of the coil",
    caption="Pulling in: switched on at 0, L_open highest, coil hot, supply lowest. Letting go: "
    "switched off at 0, L_shut highest, coil cold, supply highest, suppressor at its slowest. The "
    "current stops at zero.",
    traces=(
        Trace("letting go, slowest", f"MAX(0,FO_STEP(t,{_SLOW},I_cold,-V_slow/(R_cold+R_slow)))"),
        Trace("pulling in, slowest", "FO_STEP(t,L_open_hi/R_hot,0,I_hot)"),
    ),
    levels=(Level("pull-in, highest", "I_pull_hi"), Level("drop-out, lowest", "I_drop_lo")),
    moments=(Moment("pull-in allowed", "t_in"), Moment("release allowed", "t_out")),
    marks=(
        Mark("pulled in", "t_pull_max", "I_pull_hi"),
        Mark("let go", "t_rel_max", "I_drop_lo"),
    ),
)

CAUTIONS = (
    Caution(
        "A brake that does not close",
        "A holding brake that lets go late, or not at all, drops the load. The time of this page "
        "is that of the current; the brake closes later. Prove the stopping distance by test, also "
        "at every periodic check.",
    ),
    Caution(
        "Inductive kick",
        "A coil without its suppressor raises the voltage until something arcs. Never test, unplug "
        "or switch it without the suppressor.",
    ),
    Caution(
        "A suppressor that fails",
        "A shorted diode keeps the current up, and the brake open, for the coil's full time "
        "constant; an open one destroys the switch. Consider switching on the d.c. side, with two "
        "channels, where a fall of the load can hurt someone.",
    ),
    Caution(
        "Hot coil, hot resistor",
        "A coil in service is hot enough to burn, and its resistance is then higher than measured "
        "cold. A resistor as suppressor is hot as long as the coil is on.",
    ),
)

BASIS = Basis(
    method=(
        "Pulling in: i = V / R (1 - exp(-R t / L_open)) until I_pull. Letting go: from V / R "
        "towards -V_slow / (R + R_slow) with L_shut until I_drop, never below zero.",
        "Worst case over every corner of supply, resistance, temperature, inductance and current; "
        "the suppressor at the extreme that is worse for each result.",
    ),
    assumptions=(
        "Inductance is constant until the armature moves, and constant again once it has.",
        "The coil has settled before it is switched off; the switch opens at once.",
        "With a resistor as suppressor there is no diode in series, so that it carries the supply "
        "while the coil is on: reckoned without end, which is on the safe side.",
    ),
    sources=(
        "Copper, 0.00393 per kelvin at 20 °C: IEC 60028 (from memory; confirm against the edition "
        "in force).",
        "Inductance higher with the gap closed; release with a diode slower than with a Zener: "
        "common practice.",
    ),
    not_covered=(
        "Movement of the armature and its dip in the current, bounce, eddy currents and residual "
        "magnetism, which delay release, economy circuits, a.c. coils.",
    ),
)

SHEET = Sheet(
    name="coil",
    title="Pull-in and release of a coil",
    question="how fast does a relay, valve or brake coil pull in and let go, and what does its "
    "suppressor see?",
    purpose="To show that the coil pulls in and lets go in the times allowed, hot and cold, and "
    "that switch and suppressor stand what its current does when it is switched off.",
    picture=Picture(
        "coil.png",
        "Pulling in: the switch closes at t = 0. Letting go: it opens at t = 0 and the current "
        "goes on through the suppressor: diode, diode + Zener, or resistor.",
    ),
    groups=(COIL, SUPPLY, LIMITS),
    blocks=(PARTS, TIMES, STRESS),
    formed=(Formed("clamped", ("shape", "level"), (('"constant"', "-V_clamp/R_cold"),)),),
    worst_cases=(
        WorstCase(
            "t_pull",
            _PULL,
            tuple(Varies(part) for part in ("V_sup", "R_cu", "T_coil", "L_open", "I_pull")),
            draws=100,
        ),
        WorstCase(
            "t_rel",
            _LET_GO,
            tuple(Varies(part) for part in ("V_sup", "R_cu", "T_coil", "L_shut", "I_drop")),
            draws=100,
        ),
    ),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-004",
        "Holding brake: pull-in and release",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
)
"""The calc sheet."""
