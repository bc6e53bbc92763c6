"""What voltage, time and heat when a large inductor is dumped into a resistor?

When the supply opens, the current goes on through the dump resistor, the coil and whatever drops a
constant voltage in the loop (an arc, a diode). It heads for -V_arc / (R_dump + R_coil) and stops at
zero.
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
    Sheet,
    Tolerance,
    Trace,
    Varies,
    WorstCase,
)

BY_MASS = 'rated_by="mass and material"'
BY_ENERGY = 'rated_by="energy"'
SOLID = 'iron="solid"'
FED = 'path="always connected"'

COIL = Group(
    "Coil",
    (
        Input(
            "L_coil",
            "inductance; highest: small current, iron not saturated",
            "inductance",
            ("H", "mH", "uH"),
            1e-6,
            1e5,
            "below it takes no dump resistor, and no coil has more",
            Demo("4.5 H", "magnet data sheet at rated current", "4 H", "6 H"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "I_start",
            "current when the supply opens; highest: cold coil, highest supply",
            "current",
            ("A", "kA", "mA"),
            1e-3,
            1e6,
            "below there is nothing to dump, and no coil carries more",
            Demo("24 A", "230 V d.c. at the warm coil", "20 A", "28 A"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "R_coil",
            "resistance of the coil; lowest: cold",
            "resistance",
            ("ohm", "mohm", "kohm"),
            1e-6,
            1e6,
            "no such coil lies outside this",
            Demo("9.5 ohm", "magnet data sheet, warm", "7.8 ohm", "11 ohm"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "V_ins",
            "voltage that coil, cable and switch stand",
            "voltage",
            ("V", "kV"),
            1.0,
            1e6,
            "no insulation of a power circuit is rated outside this",
            Demo("2 kV", "magnet data sheet, test voltage in service"),
        ),
        Choice(
            "iron",
            "iron of the field: laminated (or none), or solid",
            ("laminated", "solid"),
            Demo("solid", "magnet data sheet"),
        ),
        Input(
            "t_iron",
            "further time that solid iron keeps the field, highest",
            "time",
            ("ms", "s", "min"),
            0.0,
            3600.0,
            "nobody waits longer than an hour",
            Demo("150 ms", "measured on the magnet: release after current zero"),
            needed=SOLID,
        ),
    ),
)

DUMP = Group(
    "Dump path",
    (
        Input(
            "R_dump",
            "dump resistance, with temperature",
            "resistance",
            ("ohm", "mohm", "kohm"),
            1e-6,
            1e9,
            "no dump resistor lies outside this",
            Demo("47 ohm", "resistor data sheet", "-5 %", "10 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "V_arc",
            "constant voltage in the loop: arc of the switch, diode",
            "voltage",
            ("V", "kV"),
            0.0,
            1e5,
            "it takes part of the energy, so it is not negative",
            Demo("20 V", "contactor data sheet", "10 V", "30 V"),
            Tolerance.ABSOLUTE,
        ),
        Choice(
            "path",
            "how the dump resistor is connected",
            ("behind a diode", "always connected", "switched in"),
            Demo("behind a diode", "schematic of the magnet supply"),
        ),
        Choice(
            "rated_by",
            "what limits its heat in one dump",
            ("mass and material", "energy"),
            Demo("mass and material", "resistor data sheet gives no pulse rating"),
        ),
        Input(
            "m_dump",
            "mass of the active material",
            "mass",
            ("kg", "g"),
            1e-6,
            1e6,
            "no resistor is lighter or heavier",
            Demo("28 g", "resistor data sheet: wire"),
            needed=BY_MASS,
        ),
        Input(
            "c_dump",
            "specific heat of the material, lowest",
            "specific heat",
            ("J/(kg K)",),
            50.0,
            5000.0,
            "no solid or liquid lies outside this",
            Demo("440 J/(kg K)", "nickel-chromium at 20 C, handbook (from memory)"),
            needed=BY_MASS,
        ),
        Input(
            "T_lim",
            "temperature that it stands",
            "temperature",
            ("degC",),
            0.0,
            1500.0,
            "no resistor is rated outside this",
            Demo("350 degC", "resistor data sheet"),
            needed=BY_MASS,
            rules=(Rule("T_lim>T_amb", "is not above T_amb: no heat at all is allowed then"),),
        ),
        Input(
            "T_amb",
            "temperature of the resistor before the dump, highest",
            "temperature",
            ("degC",),
            -60.0,
            1000.0,
            "nothing is colder or hotter there",
            Demo("80 degC", "after the dump before, cabinet at 45 C"),
            needed=BY_MASS,
        ),
        Input(
            "E_rated",
            "energy that it takes in one dump",
            "energy",
            ("kJ", "J", "MJ"),
            1e-6,
            1e12,
            "no resistor takes less or more",
            Demo("", ""),
            needed=BY_ENERGY,
        ),
    ),
)

AIM = Group(
    "What has to be reached",
    (
        Input(
            "I_end",
            "current to be reached",
            "current",
            ("A", "mA", "kA"),
            0.0,
            1e6,
            "the current does not reverse",
            Demo("1 A", "load drops off below it"),
            rules=(Rule("I_end<I_start_lo", "is not always below I_start: nothing to dump"),),
        ),
        Input(
            "t_ok",
            "time allowed",
            "time",
            ("ms", "s", "min"),
            1e-6,
            36000.0,
            "nobody waits longer than ten hours",
            Demo("600 ms", "release time of the crane's control"),
        ),
    ),
)

_R = "(R_dump+R_coil)"

DISCHARGE = Block(
    "Discharge, nominal",
    (
        Quantity(
            "tau",
            "time constant",
            "FO_TAU_RL(R_dump+R_coil,L_coil)",
            "time",
            "tau = L_coil / (R_dump + R_coil)",
            "L_coil/(R_dump+R_coil)",
        ),
        Quantity(
            "I_head",
            "current that it heads for",
            "-V_arc/(R_dump+R_coil)",
            "current",
            "I_head = -V_arc / (R_dump + R_coil); it stops at zero",
        ),
        Quantity(
            "t_end",
            "time to I_end",
            "FO_TIME_UNTIL_BELOW(I_end,tau,I_start,I_head)",
            "time",
            "t_end = tau ln((I_start - I_head) / (I_end - I_head))",
            f"MAX(0,L_coil/{_R}*LN((I_start+V_arc/{_R})/(I_end+V_arc/{_R})))",
        ),
        Quantity(
            "V_peak",
            "voltage across the coil at the start",
            "R_dump*I_start+V_arc",
            "voltage",
            "V_peak = R_dump I_start + V_arc",
        ),
    ),
)


def _energies(case: str, l: str, i: str, d: str, c: str, v: str) -> tuple[Quantity, ...]:  # noqa: E741
    total = f"({d}+{c})"
    worst = ", worst case for the resistor" if case else ", nominal"
    until = f"IF({v}=0,0,FO_TIME_TO(0,FO_TAU_RL({d}+{c},{l}),{i},-{v}/{total}))"
    until_by_hand = f"IF({v}=0,0,{l}/{total}*LN(1+{i}*{total}/MAX({v},1E-300)))"
    return (
        Quantity(
            f"E_coil{case}",
            f"energy of the coil{worst}",
            f"FO_ENERGY_L({l},{i})",
            "energy",
            "E = L_coil I_start^2 / 2",
            f"{l}*{i}^2/2",
        ),
        Quantity(
            f"t_zero{case}",
            "time to current zero",
            until,
            "time",
            "t_zero = tau ln(1 - I_start / I_head); 0 stands for never where V_arc = 0",
            until_by_hand,
        ),
        Quantity(
            f"E_arc{case}",
            "of that into V_arc",
            f"{v}*({l}*{i}-{v}*t_zero{case})/{total}",
            "energy",
            "E_arc = V_arc (L_coil I_start - V_arc t_zero) / (R_dump + R_coil)",
        ),
        Quantity(
            f"E_dump{case}",
            "of that into the dump resistor",
            f"IF({v}=0,{d}*FO_I2T(FO_TAU_RL({d}+{c},{l}),{i},0),{d}*FO_I2T(FO_TAU_RL({d}+{c},{l}),"
            f"{i},-{v}/{total},0,t_zero{case}))",
            "energy",
            "E_dump = R_dump times the integral of i^2 until the current is zero",
            f"({l}*{i}^2/2-{v}*({l}*{i}-{v}*t_zero{case}_hand)/{total})*{d}/{total}",
        ),
        Quantity(
            f"E_wind{case}",
            "of that into the coil's own resistance",
            f"E_coil{case}-E_arc{case}-E_dump{case}",
            "energy",
            "E_wind = E_coil - E_arc - E_dump",
        ),
    )


ENERGY = Block(
    "Where the energy goes",
    (
        *_energies("", "L_coil", "I_start", "R_dump", "R_coil", "V_arc"),
        *_energies("_hi", "L_coil_hi", "I_start_hi", "R_dump_hi", "R_coil_lo", "V_arc_lo"),
    ),
)

WORST_BLOCK = Block(
    "Worst case",
    (
        Quantity(
            "V_worst",
            "voltage across the coil at the start, highest",
            "R_dump_hi*I_start_hi+V_arc_hi",
            "voltage",
            "V_worst = R_dump,hi I_start,hi + V_arc,hi",
            "(R_dump_hi+V_arc_hi/I_start_hi)*I_start_hi",
        ),
        Quantity(
            "t_field",
            "time until the field is down, longest",
            f"t_end_max+IF({SOLID},t_iron,0)",
            "time",
            "t_field = longest t_end of part 6, and t_iron with solid iron",
        ),
        Quantity(
            "P_serv",
            "power of the dump resistor in service, before the dump",
            f"IF({FED},MAX(I_start*R_coil,I_start_hi*R_coil_lo)^2/R_dump_lo,0)",
            "power",
            "always connected: (I_start R_coil)^2 / R_dump,lo, warm or cold, whichever is more; "
            "0 behind a diode or when switched in",
        ),
        Quantity(
            "T_dump",
            "temperature of the dump resistor after it",
            f"IF({BY_MASS},T_amb+E_dump_hi/(m_dump*c_dump),NA())",
            "temperature",
            "T_dump = T_amb + E_dump / (m c), no heat given off meanwhile: on the safe side; no "
            "result where an energy rating decides",
        ),
        Quantity(
            "k_heat",
            "heat in the dump resistor, as a share of what it stands",
            f"IF({BY_MASS},E_dump_hi/(m_dump*c_dump*(T_lim-T_amb)),E_dump_hi/E_rated)",
            "ratio",
            "k_heat = E_dump / (m c (T_lim - T_amb)), or E_dump / E_rated",
        ),
    ),
)

CHECKS = (
    Check(
        "voltage",
        "Voltage across the coil",
        "V_worst",
        "V_ins",
        "voltage",
        "Insulation of coil, cable and switch",
    ),
    Check(
        "time",
        "Time until the field is down",
        "t_field",
        "t_ok",
        "time",
        "Current {I_end} reached, and t_iron after it with solid iron",
    ),
    Check(
        "heat",
        "Heat in the dump resistor",
        "k_heat",
        "1",
        "ratio",
        "Mass, material and temperature of the resistor, or its energy rating, for one dump",
    ),
)

HAZARDS = (
    Hazard(
        "Dump path may stay open",
        'path="switched in"',
        "Should the dump path not close, nothing limits the voltage but an arc: {E_coil_hi} then "
        "goes into whatever breaks down first. Connect it always, or prove it before each opening.",
    ),
    Hazard(
        "Dump resistor fed in service",
        FED,
        "With no diode before it the dump resistor turns {P_serv} into heat as long as the coil is "
        "on: T_amb, or E_rated, has to be that of a resistor so loaded for long.",
    ),
    Hazard(
        "Saturated inductance",
        "L_coil_hi<=1.02*L_coil",
        "No inductance above {L_coil} is entered. Iron that is saturated at the start has more at "
        "small current, and the tail of the current lasts longer than reckoned.",
    ),
    Hazard(
        "Solid iron",
        SOLID,
        "Eddy currents in solid iron keep the field up after the current is gone. {t_iron} is "
        "added for that; it has to be measured.",
    ),
    Hazard(
        "Hot resistor",
        f"IF({BY_MASS},T_dump>60,FALSE)",
        "The dump resistor reaches {T_dump} after one dump, more when dumps follow each other.",
    ),
    Hazard(
        "Arc takes a share",
        "E_arc_hi>0.1*E_coil_hi",
        "More than a tenth of the energy, {E_arc_hi}, goes into the arc: compare it with the "
        "switch.",
    ),
)

CURVE = Curve(
    end="MAX(t_end_max,t_field,t_ok)",
    time_unit="ms",
    quantity="current",
    unit="A",
    y_title="current of the coil",
    caption="The supply opens at 0; the current of before goes on. Slowest: L_coil and I_start "
    "highest, resistances and V_arc lowest. The time allowed includes t_iron with solid iron.",
    traces=(
        Trace(
            "slowest",
            "MAX(0,FO_STEP(t,L_coil_hi/(R_dump_lo+R_coil_lo),I_start_hi,"
            "-V_arc_lo/(R_dump_lo+R_coil_lo)))",
        ),
        Trace("nominal", "MAX(0,FO_STEP(t,tau,I_start,I_head))"),
    ),
    levels=(Level("to be reached", "I_end"),),
    moments=(Moment("time allowed", "t_ok"),),
    marks=(Mark("reached, worst case", "t_end_max", "I_end"),),
)

CAUTIONS = (
    Caution(
        "Never open the coil without its path",
        "An inductor keeps its current whatever is in the way. Opened without a path it draws an "
        "arc and a voltage that kills. Never unplug it, nor open a terminal, while current flows.",
    ),
    Caution(
        "Stored energy",
        "The energy of the coil is there until the current is proved to be zero. Wait, measure the "
        "current, then isolate, lock off, prove dead, earth.",
    ),
    Caution(
        "The load falls",
        "A lifting magnet drops its load when the current dies away. Nobody stands below, and the "
        "switch that opens it cannot be reached by accident.",
    ),
    Caution(
        "Hot resistor",
        "The dump resistor heats within a second and stays hot. Guard it, and let it cool before "
        "the next dump unless it is rated for the sequence. A diode before it that fails short "
        "lets the supply heat it all the time; one that fails open leaves the coil without a path.",
    ),
    Caution(
        "Voltage at both ends",
        "While it dumps, both poles of the coil may be at high voltage to earth, also with the "
        "supply off.",
    ),
)

BASIS = Basis(
    method=(
        "L di/dt + (R_dump + R_coil) i + V_arc = 0 from I_start: a step response towards "
        "-V_arc / (R_dump + R_coil) that stops at zero. Energy by closed-form integrals.",
        "Each check takes the corner that is worst for it: voltage at the highest resistance, time "
        "at the lowest, heat at the highest dump and the lowest coil resistance.",
    ),
    assumptions=(
        "Current commutates at once into the dump path; V_arc is constant while current flows.",
        "Behind a diode, or switched in, the dump resistor carries nothing before the dump.",
        "Inductance is constant during one discharge, at whichever of its limits is worse.",
        "The resistor gives no heat off during the dump, and its resistance lies within its limits "
        "hot and cold.",
    ),
    sources=(
        "Closed forms of the R-L discharge with a constant counter-voltage: tested against "
        "numerical integration.",
        "Specific heat: handbook value from memory; confirm with the maker of the resistor.",
    ),
    not_covered=(
        "Repeated dumps without cooling, varying arc voltage, capacitance and surges at the first "
        "instant, mechanical forces, quench of a superconducting coil, varistors as dump element.",
    ),
)

SHEET = Sheet(
    name="field-discharge",
    title="Discharge of a large coil",
    question="what voltage, time and heat when a large inductor is dumped into a resistor?",
    purpose="To show that the coil's current is down in the time allowed once its supply opens, "
    "and that the insulation stands the voltage and the dump resistor the heat.",
    picture=Picture(
        "field_discharge.png",
        "The supply opens at t = 0; the current goes on through R_dump, and V_arc where it drops. "
        "Drawn behind a diode; without one the supply feeds R_dump too.",
    ),
    groups=(COIL, DUMP, AIM),
    blocks=(DISCHARGE, ENERGY, WORST_BLOCK),
    worst_cases=(
        WorstCase(
            "t_end",
            "FO_TIME_UNTIL_BELOW(I_end,L_coil/(R_dump+R_coil),I_start,-V_arc/(R_dump+R_coil))",
            tuple(Varies(part) for part in ("L_coil", "I_start", "R_dump", "R_coil", "V_arc")),
        ),
    ),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-010",
        "Lifting magnet: switching off",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
)
"""The calc sheet."""
