"""The index of all cell functions: a live example for each, and what it must give.

What is expected comes from outside the function: a published value, or a closed form that uses
built-in functions alone. `origin` says which; tests compute each anew.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Example:
    """A function's example: formulas without "=", in base SI; `unit` is that of the result.

    `expected` is a formula, or a text in quotes; results agree `within` this share of it.
    """

    function: str
    formula: str
    expected: str
    unit: str
    origin: str
    within: float = 1e-12


@dataclass(frozen=True)
class Reads:
    """A table that examples read, under names for the whole of it or for each column.

    A text that begins with "=" is a formula, in which {row} is its own row.
    """

    title: str
    headings: tuple[str, ...]
    rows: tuple[tuple[str | float | None, ...], ...]
    name: str = ""
    columns: tuple[str, ...] = ()


EXAMPLES: tuple[Example, ...] = (
    Example("FO_TAU_RC", "FO_TAU_RC(4700,0.000001)", "0.0047", "s", "by hand: 4.7 kΩ × 1 µF"),
    Example("FO_TAU_RL", "FO_TAU_RL(2.5,0.05)", "0.02", "s", "by hand: 50 mH / 2.5 Ω"),
    Example(
        "FO_TAU_RX",
        "FO_TAU_RX(0.1,0.45*PI(),50)",
        "0.045",
        "s",
        "published: 45 ms, the standard d.c. time constant of IEC 62271-100, which is "
        "X/R = 0.045 × 2π × 50 = 14.14 at 50 Hz",
    ),
    Example(
        "FO_PARALLEL",
        "FO_PARALLEL(ohms)",
        "10",
        "Ω",
        "by hand: 1/60 + 1/30 + 1/20 = 6/60 = 1/10",
    ),
    Example(
        "FO_TAU_FOR",
        "FO_TAU_FOR(10*(1-EXP(-1)),0.2,0,10)",
        "0.2",
        "s",
        "common practice: a step response is at 63.2 % of its way after one time constant",
    ),
    Example(
        "FO_RESISTANCE_AT",
        'FO_RESISTANCE_AT(10,75,"copper")',
        "10*(1+0.00393*(75-20))",
        "Ω",
        "published: 0.00393 per kelvin at 20 °C for copper, IEC 60028",
    ),
    Example(
        "FO_NATURAL",
        "FO_NATURAL(0.2,0.2,565)",
        "565*EXP(-1)",
        "",
        "closed form: 36.8 % is left after one time constant",
    ),
    Example(
        "FO_STEP",
        "FO_STEP(5,1,0,10)",
        "10*(1-EXP(-5))",
        "",
        "closed form: 99.3 % of the way after five time constants",
    ),
    Example(
        "FO_RAMP",
        "FO_RAMP(0.5,1,0,0,10,2)",
        "5*(0.5-1+EXP(-0.5))",
        "",
        "closed form: slope × (t - tau + tau exp(-t/tau)), while the ramp rises",
    ),
    Example(
        "FO_SINE",
        "FO_SINE(0.02,1/(100*PI()),0,10,50)",
        "-5*(1-EXP(-2*PI()))",
        "",
        "closed form: with 2π f tau = 1 the lag is 45°, so after one whole period "
        "y = -A/2 (1 - exp(-2π))",
    ),
    Example(
        "FO_DECAY",
        "FO_DECAY(2,1,0,10,1)",
        "20*EXP(-2)",
        "",
        "closed form for two equal time constants: A (t/tau) exp(-t/tau)",
    ),
    Example(
        "FO_PULSE",
        "FO_PULSE(2,1,0,0,10,1)",
        "10*(1-EXP(-1))*EXP(-1)",
        "",
        "closed form: one time constant up, then one down",
    ),
    Example(
        "FO_SQUARE",
        "FO_SQUARE(2000,1,0,0,10,2,0.5)",
        "10/(EXP(1)+1)",
        "",
        "closed form: settled after 1000 periods, the lowest value is "
        "A (1 - a) a / (1 - a²) with a = exp(-1)",
    ),
    Example(
        "FO_TABLE",
        "FO_TABLE(1,1,0,points_t,points_x)",
        "4+2*EXP(-1)",
        "",
        "closed form: the line 4 + 6 t gives y = 6 t - 2 + 2 exp(-t)",
    ),
    Example(
        "FO_SUPERPOSE",
        "FO_SUPERPOSE(2,1,0,sources)",
        "4*(1-EXP(-2))+6*(1-EXP(-1))",
        "",
        "closed form: the response to the constant and that to the later step, added",
    ),
    Example(
        "FO_STAGES",
        "FO_STAGES(4,0,stages)",
        "10*(1-EXP(-2))*EXP(-2)",
        "",
        "closed form: two time constants up, held for 1 s, then two time constants down",
    ),
    Example(
        "FO_RATE",
        "FO_RATE(0.5,1,0,sources)",
        "4*EXP(-0.5)",
        "1/s",
        "closed form: (x - y) / tau with y = 4 (1 - exp(-0.5))",
    ),
    Example(
        "FO_TIME_TO",
        "FO_TIME_TO(5,1,0,10)",
        "LN(2)",
        "s",
        "closed form: halfway after ln 2 time constants",
    ),
    Example(
        "FO_TIME_UNTIL_BELOW",
        "FO_TIME_UNTIL_BELOW(60,2.5,565,0)",
        "2.5*LN(565/60)",
        "s",
        "closed form: tau ln(start / level)",
    ),
    Example(
        "FO_TIME_UNTIL_ABOVE",
        "FO_TIME_UNTIL_ABOVE(9,1,0,10)",
        "LN(10)",
        "s",
        "closed form: tau ln(10 / (10 - 9))",
    ),
    Example(
        "FO_CROSSING",
        'FO_CROSSING(5,1,0,sources,"rising")',
        "1+LN((6+4*EXP(-1))/5)",
        "s",
        "closed form: the step at 1 s meets y = 4 (1 - exp(-1)); from there to 10, passing 5",
    ),
    Example(
        "FO_TABLE_CROSSING",
        "FO_TABLE_CROSSING(5,1,0,points_t,points_x,TRUE)",
        "1+LN((6+4*EXP(-1))/5)",
        "s",
        "closed form: the same forcing, each level held until the next point",
    ),
    Example(
        "FO_STAGES_CROSSING",
        'FO_STAGES_CROSSING(5,0,stages,"falling")',
        "3+0.5*LN(2*(1-EXP(-2)))",
        "s",
        "closed form: from 10 (1 - exp(-2)) at 3 s down to 5 with tau = 0.5 s",
    ),
    Example(
        "FO_STAYS_WITHIN",
        "FO_STAYS_WITHIN(9,11,1,0,sources,20)",
        "1+LN(6+4*EXP(-1))",
        "s",
        "closed form: the time at which 1 is left of the way to 10",
    ),
    Example(
        "FO_PEAK",
        'FO_PEAK(1,0,fading,0,10,"max")',
        "5",
        "",
        "closed form: 20 (exp(-t/2) - exp(-t)) is highest at t = 2 ln 2, where it is "
        "20 (1/2 - 1/4)",
    ),
    Example(
        "FO_RISE_TIME",
        "FO_RISE_TIME(1)",
        "LN(9)",
        "s",
        "common practice: from 10 % to 90 % in 2.197 time constants",
    ),
    Example(
        "FO_SETTLING_TIME",
        "FO_SETTLING_TIME(1,2^-13)",
        "13*LN(2)",
        "s",
        "common practice: to half a step of 12 bits in (12 + 1) ln 2 time constants",
    ),
    Example("FO_ENERGY_C", "FO_ENERGY_C(0.0047,400)", "376", "J", "by hand: 4.7 mF × (400 V)² / 2"),
    Example("FO_ENERGY_L", "FO_ENERGY_L(0.8,30)", "360", "J", "by hand: 0.8 H × (30 A)² / 2"),
    Example(
        "FO_C_FOR_ENERGY",
        "FO_C_FOR_ENERGY(32,100,60)",
        "0.01",
        "F",
        "by hand: 2 × 32 J / (100² - 60²) V²",
    ),
    Example(
        "FO_MEAN",
        "FO_MEAN(1,0,sources,0,1)",
        "4*EXP(-1)",
        "",
        "closed form: the mean of 4 (1 - exp(-t)) from 0 to 1",
    ),
    Example(
        "FO_RMS",
        "FO_RMS(1,0,sources,0,1)",
        "4*SQRT(1-2*(1-EXP(-1))+(1-EXP(-2))/2)",
        "",
        "closed form: the square of 4 (1 - exp(-t)) integrated from 0 to 1",
    ),
    Example("FO_I2T", "FO_I2T(0.045,1000,0)", "22500", "A²s", "closed form: I² tau / 2"),
    Example(
        "FO_DISSIPATED",
        'FO_DISSIPATED(2,"current",0.4,30,0)',
        "360",
        "J",
        "by hand: all that a coil of 2 Ω × 0.4 s = 0.8 H had stored at 30 A",
    ),
    Example(
        "FO_RIDE_THROUGH",
        'FO_RIDE_THROUGH(0.01,100,60,500,"power",0.5)',
        "0.01*((50+SQRT(9000)/2)^2-60^2)/1000-0.005*LN((50+SQRT(9000)/2)/60)",
        "s",
        "closed form: C (u² - 60²) / (2 P) - R C ln(u / 60), u = (100 + sqrt(100² - 4 P R)) / 2 "
        "the load's first voltage",
    ),
    Example(
        "FO_RIPPLE",
        'FO_RIPPLE(1,0,10,2,0.5,"pp")',
        "10*(EXP(1)-1)/(EXP(1)+1)",
        "",
        "closed form at duty 1/2: A tanh(T / (4 tau))",
    ),
    Example(
        "FO_CORNER_FREQUENCY",
        "FO_CORNER_FREQUENCY(0.001)",
        "1/(0.002*PI())",
        "Hz",
        "closed form: 1 / (2π tau)",
    ),
    Example("FO_TAU_AT", "FO_TAU_AT(50)", "1/(100*PI())", "s", "closed form: 1 / (2π f)"),
    Example(
        "FO_GAIN_DB",
        "FO_GAIN_DB(1000,1/(2000*PI()))",
        "-10*LN(2)/LN(10)",
        "dB",
        "common practice: at the corner the power is halved, -3.01 dB",
    ),
    Example(
        "FO_PHASE",
        "FO_PHASE(1000,1/(2000*PI()))",
        "-45",
        "°",
        "common practice: 45° behind at the corner",
    ),
    Example(
        "FO_NOISE_BANDWIDTH",
        "FO_NOISE_BANDWIDTH(0.001)",
        "250",
        "Hz",
        "common practice: π/2 times the corner frequency, so 1 / (4 tau)",
    ),
    Example(
        "FO_FAULT_CURRENT",
        "FO_FAULT_CURRENT(0.005,1000,1,1,50,45)",
        "1000*SQRT(2)",
        "A",
        "closed form: with R = X and closing at 45° there is no d.c. part; a quarter period "
        "later the crest",
    ),
    Example(
        "FO_DC_OFFSET",
        "FO_DC_OFFSET(0.01,1000,1,1,50,0)",
        "1000*EXP(-PI())",
        "A",
        "closed form: -sqrt(2) I sin(-45°) exp(-t/tau), after half a period exp(-π)",
    ),
    Example(
        "FO_DC_WORST",
        "FO_DC_WORST(0.045,1000,0.1,0.45*PI(),50)",
        "1000*SQRT(2)*EXP(-1)",
        "A",
        "closed form: sqrt(2) I exp(-t/tau), here after one time constant of 45 ms",
    ),
    Example(
        "FO_PEAK_FACTOR",
        "FO_PEAK_FACTOR(0.1,0.45*PI())",
        "1.02+0.98*EXP(-3*0.1/(0.45*PI()))",
        "",
        "published: IEC 60909-0, 1.02 + 0.98 exp(-3 R/X), a fit to the exact factor; agreement "
        "to 0.6 % is asked for",
        0.006,
    ),
    Example(
        "FO_FAULT_I2T",
        "FO_FAULT_I2T(1000,1,1,50,45,0.02)",
        "20000",
        "A²s",
        "closed form: without a d.c. part I² t over a whole period",
    ),
    Example(
        "FO_NETWORK",
        'FO_NETWORK(network,"tau")',
        "0.0005",
        "s",
        "by hand: R1 and R2 in parallel, 500 Ω, times 1 µF",
    ),
    Example(
        "FO_NETWORK_AT",
        'FO_NETWORK_AT(0.0005,network,"voltage at out")',
        "5*(1-EXP(-1))",
        "V",
        "closed form: the divider's 5 V, after one time constant",
    ),
    Example(
        "FO_NETWORK_CROSSING",
        'FO_NETWORK_CROSSING(2.5,network,"voltage at out")',
        "0.0005*LN(2)",
        "s",
        "closed form: halfway to 5 V after ln 2 time constants",
    ),
    Example(
        "FO_NETWORK_PEAK",
        'FO_NETWORK_PEAK(network,"current through R1",0,0.01)',
        "0.01",
        "A",
        "by hand: 10 V across 1 kΩ while C1 is still empty",
    ),
    Example(
        "FO_NETWORK_ENERGY",
        'FO_NETWORK_ENERGY(network,"C1",0,0.1)',
        "0.0000125",
        "J",
        "by hand: 1 µF × (5 V)² / 2, after 200 time constants",
    ),
    Example(
        "FO_EQUIVALENT",
        'FO_EQUIVALENT(network,"out","earth","resistance")',
        "500",
        "Ω",
        "by hand: R1 and R2 in parallel, the source being a short",
    ),
    Example(
        "FO_CORNERS",
        "SUM(FO_CORNERS(lowest,highest))",
        "132",
        "",
        "by hand: in the 8 corners of 3 parts each extreme stands 4 times: 4 × (9 + 11 + 4 + 6 + "
        "1 + 2)",
    ),
    Example(
        "FO_DRAW",
        "SUMPRODUCT(INT(FO_DRAW(0,100,100)))",
        "4950",
        "",
        "by hand: each of 100 equal strips is drawn from once, so the whole parts are 0 to 99",
    ),
    Example(
        "FO_PREFERRED",
        'FO_PREFERRED(31300,"E24","down")',
        "30000",
        "",
        "published: IEC 60063, series E24 has 30 and then 33",
    ),
    Example("FO_RKM", 'FO_RKM("4K7")', "4700", "", "published: IEC 60062, the letter is the point"),
    Example(
        "FO_RKM_TEXT",
        'FO_RKM_TEXT(0.47,"ohm")',
        '"R47"',
        "",
        "published: IEC 60062, R stands for the point of a number of ohms",
    ),
    Example("FO_SI", 'FO_SI(470,"uF")', "0.00047", "F", "published: the SI prefix µ is 10^-6"),
    Example("FO_IN", 'FO_IN(0.00047,"uF")', "470", "µF", "published: the SI prefix µ is 10^-6"),
    Example(
        "FO_TEXT",
        'FO_TEXT(0.00047,"F")',
        '"470 µF"',
        "",
        "published: SI, the prefix that leaves a number from 1 to 999",
    ),
    Example(
        "FO_FIT",
        'FO_FIT(curve_t,curve_y,"tau")',
        "2",
        "s",
        "by hand: the points are computed with tau = 2 by EXP alone; agreement to 1 in 10^9 is "
        "asked for",
        1e-9,
    ),
    Example(
        "FO_FIT_FROM",
        'FO_FIT_FROM(pressure,volume,0,0,"tau")',
        "1/0.00055015643181",
        "",
        "published: NIST StRD Misra1a, certified b2 = 5.5015643181E-04, of which tau is the "
        "reciprocal; agreement to 1 in 10^9 is asked for",
        1e-9,
    ),
    Example(
        "FO_TRIP_TIME",
        "FO_TRIP_TIME(1.05,600,0,2)",
        "600*LN(4/(4-1.05^2))",
        "s",
        "published: IEC 60255-149, cold curve tau ln(I² / (I² - Ik²)); equation number not "
        "recalled",
    ),
    Example(
        "FO_VERSION",
        "FO_VERSION()",
        "{version}",
        "",
        "the version that stands in the metadata of the installed package",
    ),
    Example(
        "FO_REASON",
        'FO_REASON("FO_STEP",1,0,0,5)',
        '"FO_STEP: tau is 0; allowed: number > 0; enter the time constant (s)"',
        "",
        "a text, so written down, not derived: as the help promises it says which argument, what "
        "came, what is allowed, what to do",
    ),
)
"""Every cell function once, group by group as the catalogue has it."""

READS: tuple[Reads, ...] = (
    Reads("Resistors side by side", ("ohms",), ((60.0,), (30.0,), (20.0,)), columns=("ohms",)),
    Reads(
        "sources: a constant, and a step at 1 s",
        ("Shape", "A", "B", "C", "D", "E"),
        (("constant", 4.0, None, None, None, None), ("step", 6.0, 1.0, None, None, None)),
        name="sources",
    ),
    Reads(
        "fading: a source that decays with 2 s",
        ("Shape", "A", "B", "C", "D", "E"),
        (("decay", 10.0, 2.0, None, None, None),),
        name="fading",
    ),
    Reads(
        "stages: charged, isolated, discharged",
        ("Starts at", "Time constant", "Heads for"),
        ((0.0, 1.0, 10.0), (2.0, "hold", None), (3.0, 0.5, 0.0)),
        name="stages",
    ),
    Reads(
        "Two points of a drawn forcing",
        ("points_t", "points_x"),
        ((0.0, 4.0), (1.0, 10.0)),
        columns=("points_t", "points_x"),
    ),
    Reads(
        "network: a divider of 10 V that charges a capacitor",
        ("Name", "Kind", "From", "To", "Value", "Start"),
        (
            ("S1", "voltage source", "earth", "in", 10.0, None),
            ("R1", "resistor", "in", "out", 1000.0, None),
            ("R2", "resistor", "out", "earth", 1000.0, None),
            ("C1", "capacitor", "out", "earth", 0.000001, 0.0),
        ),
        name="network",
    ),
    Reads(
        "Extremes of three parts",
        ("lowest", "highest"),
        ((9.0, 11.0), (4.0, 6.0), (1.0, 2.0)),
        columns=("lowest", "highest"),
    ),
    Reads(
        "Points of 10 (1 - exp(-t/2)), computed by EXP",
        ("curve_t", "curve_y"),
        tuple((t, "=10*(1-EXP(-A{row}/2))") for t in (0.0, 1.0, 2.0, 3.0, 4.0, 6.0, 8.0)),
        columns=("curve_t", "curve_y"),
    ),
    Reads(
        "Measured points, NIST StRD Misra1a",
        ("pressure", "volume"),
        (
            (77.6, 10.07), (114.9, 14.73), (141.1, 17.94), (190.8, 23.93), (239.9, 29.61),
            (289.0, 35.18), (332.8, 40.02), (378.4, 44.82), (434.8, 50.76), (477.3, 55.05),
            (536.8, 61.01), (593.1, 66.40), (689.1, 75.47), (760.0, 81.78),
        ),
        columns=("pressure", "volume"),
    ),
)  # fmt: skip
"""The tables that the examples read."""
