"""How long does the capacitor carry the load after the supply fails?

The load is a resistance, a current or a power. A power draws more the lower the voltage gets, so
that it may collapse through the series resistance before the lowest voltage is reached: then there
is no time. Every check is at the end of the capacitor's life and at the lowest temperature.
"""

from __future__ import annotations

from tausheet.functions.parts import SERIES
from tausheet.templates.model import (
    NUMBER,
    Basis,
    Block,
    Caution,
    Check,
    Choice,
    Column,
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
    Table,
    Tolerance,
    Trace,
    Varies,
    WorstCase,
)

CAPACITOR = Group(
    "Capacitor",
    (
        Input(
            "C_nom",
            "capacitance, new, at room temperature",
            "capacitance",
            ("mF", "uF", "F"),
            1e-9,
            1e4,
            "a capacitor that carries a load lies between these",
            Demo("40 mF", "four of 10 mF, capacitor data sheet", "-20 %", "20 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "k_age",
            "share of it left at the end of its life",
            "ratio",
            ("%",),
            0.1,
            1.0,
            "ageing takes away, and less than a tenth is no capacitor any more",
            Demo("80 %", "capacitor data sheet, end of life"),
        ),
        Input(
            "k_cold",
            "share of it left at the lowest temperature",
            "ratio",
            ("%",),
            0.1,
            1.0,
            "cold takes away, and less than a tenth is no capacitor any more",
            Demo("85 %", "capacitor data sheet, curve at -25 C"),
        ),
        Input(
            "R_ser",
            "resistance in series, its own and that of the wiring",
            "resistance",
            ("mohm", "ohm", "uohm"),
            0.0,
            1e6,
            "it is never negative, and with more than this nothing is carried",
            Demo("40 mohm", "data sheet; highest: aged, at -25 C", "20 mohm", "90 mohm"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "V_cap",
            "rated voltage of the capacitor",
            "voltage",
            ("V", "kV"),
            0.5,
            20e3,
            "no capacitor of such a buffer is rated outside this",
            Demo("35 V", "capacitor data sheet"),
        ),
    ),
)

VOLTAGE = Group(
    "Voltage and time",
    (
        Input(
            "V_from",
            "voltage of the capacitor when the supply fails",
            "voltage",
            ("V", "mV", "kV"),
            0.1,
            20e3,
            "below there is nothing to carry with, above it is no buffer",
            Demo("23.5 V", "supply data sheet, less the diode", "23 V", "24.2 V"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "V_min",
            "lowest voltage at which the load still works",
            "voltage",
            ("V", "mV", "kV"),
            0.01,
            20e3,
            "a load that works at less than this needs no sheet",
            Demo("18 V", "converter data sheet, under-voltage lock-out, highest"),
            rules=(
                Rule(
                    "V_min<V_from_lo",
                    "is not below the lowest V_from, so there is no fall to use: look for a slip",
                ),
            ),
        ),
        Input(
            "t_need",
            "time to be carried",
            "time",
            ("ms", "s", "us", "min"),
            1e-7,
            1e6,
            "a failure that is ridden through lasts between these",
            Demo("40 ms", "change-over of the crane's control supply"),
        ),
    ),
)

LOAD = Group(
    "Load, at its heaviest",
    (
        Choice(
            "load",
            "what the load keeps constant",
            ("power", "current", "resistance"),
            Demo("power", "the brake controller hangs on a converter"),
        ),
        Input(
            "P_load",
            "power: what the load takes, highest",
            "power",
            ("W", "mW", "kW", "uW"),
            1e-9,
            1e9,
            "no load lies outside this",
            Demo("40 W", "brake controller data sheet"),
            needed='load="power"',
        ),
        Input(
            "eta",
            "power: efficiency of the converter before it, lowest (100 % without one)",
            "ratio",
            ("%",),
            0.05,
            1.0,
            "a converter gives less than it takes, and below a twentieth it is a heater",
            Demo("85 %", "converter data sheet, cold, at 18 V"),
            needed='load="power"',
        ),
        Input(
            "I_load",
            "current: what the load takes, highest",
            "current",
            ("A", "mA", "uA", "kA"),
            1e-12,
            1e6,
            "no load lies outside this",
            Demo("2 A", "not used on this page"),
            needed='load="current"',
        ),
        Input(
            "R_load",
            "resistance: of the load, lowest",
            "resistance",
            ("ohm", "kohm", "mohm", "Mohm"),
            1e-6,
            1e12,
            "no load lies outside this",
            Demo("12 ohm", "not used on this page"),
            needed='load="resistance"',
        ),
        Choice(
            "series",
            "preferred numbers to choose a capacitance from",
            ("E6", "E12", "E24"),
            Demo("E12", "stock list of the workshop"),
        ),
    ),
)

_C_LO = "C_nom_lo*k_life"


def _starts(voltage: str, series: str) -> str:
    """Voltage at the load just after the supply has failed."""
    return (
        f'IF(load="power",({voltage}+SQRT({voltage}^2-4*demand*{series}))/2,'
        f'IF(load="current",{voltage}-{series}*demand,{voltage}*demand/(demand+{series})))'
    )


def _falls(start: str, end: str, capacitance: str, series: str) -> str:
    """Time that the load's voltage takes from one value to another, with built-in functions."""
    return (
        f'IF(load="power",{capacitance}*(({start})^2-{end}^2)/2/demand'
        f"-{series}*{capacitance}*LN(({start})/{end}),"
        f'IF(load="current",{capacitance}*(({start})-{end})/demand,'
        f"({series}+demand)*{capacitance}*LN(({start})/{end})))"
    )


def _carried(start: str, capacitance: str, series: str) -> str:
    """The same down to V_min; no result where the load starts below it or collapses above it."""
    return (
        f"IF(AND({start}>=V_min,V_min^2>=P_all*{series}),"
        f"{_falls(start, 'V_min', capacitance, series)},NA())"
    )


START = Block(
    "Load and capacitor",
    (
        Quantity(
            "k_life",
            "share of the capacitance left, aged and cold",
            "k_age*k_cold",
            NUMBER,
            "k_life = k_age k_cold",
        ),
        Quantity(
            "demand",
            "what the capacitor has to give, in W, A or ohm as load says",
            'IF(load="power",P_load/eta,IF(load="current",I_load,R_load))',
            NUMBER,
            "P_load / eta, or I_load, or R_load",
        ),
        Quantity(
            "P_all",
            "constant power to be given",
            'IF(load="power",demand,0)',
            "power",
            "P_load / eta; 0 for the other kinds of load",
        ),
        Quantity(
            "V_crit",
            "voltage at which constant power collapses, highest",
            "SQRT(P_all*R_ser_hi)",
            "voltage",
            "V_crit = sqrt(P R_ser,hi): half of the capacitor's voltage is then lost in R_ser, and "
            "less voltage gives less power, whatever the current; 0 for the other kinds of load",
            "(P_all*R_ser_hi)^0.5",
        ),
        Quantity(
            "V_go",
            "voltage at the load just after the failure, lowest",
            _starts("V_from_lo", "R_ser_hi"),
            "voltage",
            "V_from,lo less the drop in R_ser,hi; no result where the power cannot be drawn at all",
            'IF(load="power",V_from_lo/2*(1+(1-4*demand*R_ser_hi/V_from_lo^2)^0.5),'
            'IF(load="current",V_from_lo-R_ser_hi*demand,V_from_lo/(1+R_ser_hi/demand)))',
        ),
    ),
)

TIME = Block(
    "Time",
    (
        Quantity(
            "V_mid",
            "voltage at the load just after the failure, nominal",
            _starts("V_from", "R_ser"),
            "voltage",
            "as V_go, with V_from and R_ser nominal",
        ),
        Quantity(
            "t_ride",
            "time that the load is carried, aged and cold, nominal",
            "FO_RIDE_THROUGH(C_nom*k_life,V_from,V_min,demand,load,R_ser)",
            "time",
            "power: C (u^2 - V_min^2) / (2 P) - R_ser C ln(u / V_min); current: C (u - V_min) / I; "
            "resistance: (R_ser + R) C ln(u / V_min); u = V_mid, C = k_life C_nom",
            _carried("V_mid", "C_nom*k_life", "R_ser"),
        ),
        Quantity(
            "t_fresh",
            "the same when new and warm",
            "FO_RIDE_THROUGH(C_nom,V_from,V_min,demand,load,R_ser)",
            "time",
            "as t_ride, with k_life = 1: what a test of the new device would show",
        ),
        Quantity(
            "R_bad",
            "series resistance with which the time is shortest",
            'IF(load="resistance",IF((R_ser_lo+demand)*LN(V_from_lo*demand/(demand+R_ser_lo)/V_min)'
            "<(R_ser_hi+demand)*LN(V_from_lo*demand/(demand+R_ser_hi)/V_min),R_ser_lo,R_ser_hi),"
            "R_ser_hi)",
            "resistance",
            "the highest; but before a load resistance, in a fall to less than 1 / 2.7, a higher "
            "R_ser makes the fall slower, so both ends are tried",
        ),
        Quantity(
            "V_bad",
            "voltage at the load with it, just after the failure",
            _starts("V_from_lo", "R_bad"),
            "voltage",
            "as V_go, with R_bad",
        ),
        Quantity(
            "t_least",
            "time that the load is carried, shortest",
            f"FO_RIDE_THROUGH({_C_LO},V_from_lo,V_min,demand,load,R_bad)",
            "time",
            "as t_ride, with C_nom and V_from at their lowest, and R_bad",
            _carried("V_bad", f"{_C_LO}", "R_bad"),
        ),
    ),
)

ENERGY = Block(
    "Energy, in the shortest time",
    (
        Quantity(
            "E_load",
            "energy delivered, to the converter where there is one",
            'IF(load="power",demand*t_least,IF(load="current",demand*(V_bad+V_min)/2*t_least,'
            'FO_DISSIPATED(demand,"voltage",(demand+R_bad)*C_nom_lo*k_life,V_bad,0,0,t_least)))',
            "energy",
            "P t; I times the mean voltage times t; the integral of u^2 / R",
            'IF(ISNUMBER(t_least_hand),IF(load="power",demand*t_least_hand,IF(load="current",'
            f"{_C_LO}*(V_bad^2-V_min^2)/2,{_C_LO}*(demand+R_bad)/demand*(V_bad^2-V_min^2)/2)),NA())",
        ),
        Quantity(
            "V_left",
            "voltage inside the capacitor when the load gives up",
            'V_min+R_bad*IF(load="power",demand/V_min,IF(load="current",demand,V_min/demand))',
            "voltage",
            "V_min and the drop in R_bad; the voltage returns to this once the load is off",
        ),
        Quantity(
            "V_rest",
            "the same, nominal",
            'V_min+R_ser*IF(load="power",demand/V_min,IF(load="current",demand,V_min/demand))',
            "voltage",
            "as V_left, with R_ser nominal",
        ),
        Quantity(
            "E_taken",
            "energy that the capacitor gives for it",
            f"FO_ENERGY_C({_C_LO},V_from_lo)-FO_ENERGY_C({_C_LO},V_left)",
            "energy",
            "C (V_from^2 - V_left^2) / 2; the rest of it heats R_ser",
            f"{_C_LO}*(V_from_lo-V_left)*(V_from_lo+V_left)/2",
        ),
        Quantity(
            "E_store",
            "energy stored, highest",
            "FO_ENERGY_C(C_nom_hi,V_from_hi)",
            "energy",
            "C_nom,hi V_from,hi^2 / 2, new and warm: what a short would set free",
            "C_nom_hi*V_from_hi*V_from_hi/2",
        ),
        Quantity(
            "I_last",
            "current at the end, highest",
            'IF(load="power",demand/V_min,IF(load="current",demand,V_go/demand))',
            "current",
            "P / V_min; I; for a resistance the current at the start",
        ),
    ),
)

_DECADE = "10^INT(LOG10(C_need_hand))"
_NUMBER = f"ROUND(C_need_hand/{_DECADE},11)"

CHOICE = Block(
    "Choice of the capacitance",
    (
        Quantity(
            "C_need",
            "nominal capacitance needed",
            "C_nom*t_need/t_ride_min",
            "capacitance",
            "C_need = C_nom t_need / t_ride,min: the time is proportional to the capacitance while "
            "R_ser stays as entered",
            "C_nom*t_need/t_least_hand",
        ),
        Quantity(
            "C_pref",
            "preferred value at or over it",
            'FO_PREFERRED(C_need,series,"up")',
            "capacitance",
            "the next number of the series at or above C_need; the second way looks it up in the "
            "worksheet Tables",
            f"{_DECADE}*IF("
            + ",IF(".join(
                f'series="{name}",IF({_NUMBER}>INDEX(series_{name},{len(SERIES[name])}),10,'
                f"INDEX(series_{name},SUMPRODUCT((series_{name}<{_NUMBER})*1)+1))"
                for name in ("E6", "E12", "E24")
            )
            + ",NA())))",
        ),
    ),
)

WORST = WorstCase(
    "t_ride",
    "FO_RIDE_THROUGH(C_nom*k_life,V_from,V_min,demand,load,R_ser)",
    (
        Varies("C_nom"),
        Varies("V_from"),
        # before a load resistance the longest time may lie between the ends, at u / V_min = e
        Varies(
            "R_ser",
            'IF(load="resistance",V_from_hi*demand/(EXP(1)*V_min)-demand,R_ser_lo)',
        ),
    ),
)

CHECKS = (
    Check(
        "time",
        "Time that the load is carried",
        "t_ride_min",
        "t_need",
        "time",
        "The failure to be bridged, at the end of life and at the lowest temperature",
        Sense.AT_LEAST,
    ),
    Check(
        "collapse",
        "Voltage at which the power collapses",
        "V_crit",
        "V_min",
        "voltage",
        "Constant power through R_ser holds only above sqrt(P R_ser); 0 for other loads",
    ),
    Check(
        "start",
        "Voltage at the load after the failure",
        "V_go",
        "V_min",
        "voltage",
        "The drop in R_ser must leave the load its lowest voltage",
        Sense.AT_LEAST,
    ),
    Check(
        "rating",
        "Voltage of the capacitor",
        "V_from_hi",
        "V_cap",
        "voltage",
        "Rated voltage of the capacitor's data sheet",
    ),
)

HAZARDS = (
    Hazard(
        "Constant power collapses",
        "IF(P_all>0,OR(V_crit>V_min,4*P_all*R_ser_hi>V_from_lo^2),FALSE)",
        "The power cannot be drawn below {V_crit} at the load: it collapses through R_ser while "
        "the load should still work, and there is no time.",
    ),
    Hazard(
        "Close to collapse",
        "IF(P_all>0,AND(V_crit<=V_min,1.5*V_crit>V_min),FALSE)",
        "The power collapses at {V_crit}, within a third of V_min: a little more R_ser or load "
        "takes all of the time.",
    ),
    Hazard(
        "Only while it is new",
        "AND(t_ride_min<t_need,t_fresh>=t_need)",
        "New and warm it carries the load for {t_fresh}: a test of the new device passes, the old "
        "or cold one fails.",
    ),
    Hazard(
        "Drop at the start",
        "V_from_lo-V_go>0.25*(V_from_lo-V_min)",
        "A quarter or more of the fall that may be used is lost in R_ser at once: the load starts "
        "at {V_go}.",
    ),
)

_ROWS = 40


def _fall(name: str, start: str, capacitance: str, series: str, whole: str) -> Formed:
    """The voltage at the load in equal steps down to V_min, and when it gets there.

    Without a time for the whole fall there is no curve either.
    """
    step = f"({start}-V_min)/{_ROWS}"
    times = f"IF(ISNUMBER({whole}),{_falls(start, 'here_u', capacitance, series)},NA())"
    rows = [(start, "0")]
    rows += [(f"{start}-{number}*{step}", times) for number in range(1, _ROWS)]
    rows += [("V_min", times)]
    return Formed(name, ("u", "at"), tuple(rows))


def _read(name: str, end: str) -> str:
    """The voltage at a time, between two rows of the table; before and after it what is open."""
    at = f"SUMPRODUCT(({name}_at<=t)*1)"
    here, there = f"INDEX({name}_u,{at})", f"INDEX({name}_u,{at}+1)"
    since, span = f"(t-INDEX({name}_at,{at}))", f"(INDEX({name}_at,{at}+1)-INDEX({name}_at,{at}))"
    voltage, after = end.split()
    return (
        f"IF(t<0,{voltage},IF(t>=INDEX({name}_at,{_ROWS + 1}),{after},"
        f"{here}+({there}-{here})*{since}/{span}))"
    )


CURVE = Curve(
    end="1.5*MAX(t_need,t_ride)",
    time_unit="ms",
    quantity="voltage",
    unit="V",
    y_title="voltage at the load",
    caption="Supply fails at 0. Aged and cold. Shortest: C_nom and V_from at their lowest, R_bad. "
    "At V_min the load gives up, and the voltage returns to what is left in the capacitor.",
    traces=(
        Trace("shortest", _read("bad", "V_from_lo V_left")),
        Trace("nominal", _read("mid", "V_from V_rest")),
    ),
    levels=(Level("lowest voltage of the load", "V_min"),),
    moments=(Moment("time to be carried", "t_need"),),
    marks=(Mark("load gives up, shortest", "t_ride_min", "V_min"),),
    from_zero=False,
)

CAUTIONS = (
    Caution(
        "The load lives on after switching off",
        "While the capacitor carries it, a control goes on working: outputs stay set and a brake "
        "stays open after the supply is off. An emergency stop must act behind the buffer.",
    ),
    Caution(
        "What happens when it gives up",
        "At V_min the load stops, and the voltage returns. A load that starts again by itself "
        "falls out and in; let it lock out, and let the machine reach its safe state before.",
    ),
    Caution(
        "Stored energy",
        "A large capacitor at a harmless voltage still burns and welds: rings and tools off, a "
        "fuse at its terminals, a resistor that discharges it, and a measurement before touching.",
    ),
    Caution(
        "Inrush",
        "An empty capacitor is a short to the supply. Limit the charging current, or the supply "
        "and the fuse see a fault at every start (see the sheet precharge).",
    ),
    Caution(
        "Age and cold",
        "Capacitance falls and series resistance rises with age, most in the cold. Replace at the "
        "end of the stated life, and test the carried time at intervals, not the voltage.",
    ),
)

BASIS = Basis(
    method=(
        "C du/dt = -i with i = u / R, I or P / u, u at the load and R_ser before it, integrated in "
        "closed form until u has fallen to V_min.",
        "Constant power: the lower the voltage, the higher the current. Through R_ser it holds "
        "only above sqrt(P R_ser); where that lies above V_min there is no time, and the sheet "
        "fails.",
        "Every check takes the worst corner, with the capacitance aged and cold at once.",
    ),
    assumptions=(
        "The supply gives nothing from t = 0 and takes nothing back: a diode or an equal stands "
        "before the capacitor.",
        "The load is at its heaviest all the time, and its efficiency at its lowest.",
        "Capacitance and series resistance stay what they are during the fall; C_nom, V_from and "
        "R_ser vary independently within their limits.",
    ),
    sources=(
        "Equations: closed form of C du/dt = -i. Preferred numbers: IEC 60063.",
        "End of life of aluminium electrolytics at 80 % of the capacitance and a multiple of the "
        "series resistance: common practice; the data sheet decides.",
    ),
    not_covered=(
        "Capacitors whose capacitance changes with voltage (class 2 ceramics, double layers), "
        "inductance in the path, leakage and self-discharge, sharing among capacitors in series, "
        "and the time that the supply takes to charge the capacitor again.",
    ),
)

SHEET = Sheet(
    name="ride-through",
    title="Ride-through from a capacitor",
    question="how long does the capacitor carry the load after the supply fails?",
    purpose="To show that the capacitor, old and cold, carries the load for the time needed after "
    "the supply has failed, and that a load of constant power does not collapse on the way.",
    picture=Picture(
        "ride_through.png",
        "The supply fails at t = 0, with the capacitor at V_from. It feeds the load through R_ser "
        "until the voltage at the load has fallen to V_min.",
    ),
    groups=(CAPACITOR, VOLTAGE, LOAD),
    blocks=(START, TIME, ENERGY, CHOICE),
    worst_cases=(WORST,),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-008",
        "Brake controller, 24 V: ride-through",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
    tables=(
        Table(
            "series",
            "Preferred numbers of one decade (IEC 60063)",
            tuple(
                Column(name, name, tuple(number / 100 for number in SERIES[name]))
                for name in ("E6", "E12", "E24")
            ),
        ),
    ),
    formed=(
        _fall("bad", "V_bad", _C_LO, "R_bad", "t_least_hand"),
        _fall("mid", "V_mid", "C_nom*k_life", "R_ser", "t_ride_hand"),
    ),
)
"""The calc sheet."""
