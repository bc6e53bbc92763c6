"""What is the first peak of a fault current, and how does its d.c. part die away?

A three-phase fault far from generators, with a contribution of motors beside the network. The
highest current has the lowest resistance (coldest conductor) and reactance; the first peak and the
d.c. part at contact parting each take their own worst closing angle.
"""

from __future__ import annotations

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
    Sheet,
    Table,
    Tolerance,
    Trace,
    Varies,
    WorstCase,
)

BY_TIME = "time constant (IEC 62271-100)"
BY_FACTOR = "power factor (IEC 60947-2)"
_BY_TIME = f'rated_by="{BY_TIME}"'

NETWORK = Group(
    "Network up to the fault",
    (
        Input(
            "U_net",
            "nominal voltage, line to line",
            "voltage",
            ("kV", "V"),
            50.0,
            800e3,
            "no three-phase network has a nominal voltage outside this",
            Demo("10 kV", "single-line diagram of the harbour substation"),
        ),
        Input(
            "c_max",
            "voltage factor for the highest current",
            NUMBER,
            (),
            1.0,
            1.2,
            "the factor is 1.05 or 1.10 in IEC 60909-0, table 1 (from memory)",
            Demo("1.1", "IEC 60909-0, table 1, above 1 kV"),
        ),
        Input(
            "f_net",
            "frequency",
            "frequency",
            ("Hz",),
            16.0,
            400.0,
            "networks run at 16.7 to 400 Hz",
            Demo("50 Hz", "single-line diagram of the harbour substation"),
        ),
        Input(
            "R_20",
            "resistance of one phase at 20 °C",
            "resistance",
            ("mohm", "ohm", "uohm"),
            1e-6,
            100.0,
            "a path beyond this is a slip in the unit",
            Demo(
                "42 mohm", "utility's data sheet and feeder cable, the whole path", "-10 %", "10 %"
            ),
            Tolerance.PERCENT,
        ),
        Input(
            "X_net",
            "reactance of one phase at f_net",
            "resistance",
            ("mohm", "ohm", "uohm"),
            1e-6,
            1000.0,
            "a path beyond this is a slip in the unit",
            Demo("360 mohm", "utility's data sheet and feeder cable", "-8 %", "8 %"),
            Tolerance.PERCENT,
            (
                Rule(
                    "X_net_lo>=0.15*R_20_hi",
                    "falls below 0.15 R_20: so little reactance leaves no d.c. part to speak of, "
                    "and the settled current decides without this sheet",
                ),
            ),
        ),
        Choice(
            "metal",
            "conductor of the fault path",
            ("copper", "aluminium"),
            Demo("aluminium", "feeder cable"),
        ),
        Input(
            "T_cond",
            "conductor as the fault begins",
            "temperature",
            ("degC",),
            -60.0,
            120.0,
            "a conductor in service is between these",
            Demo(
                "40 degC", "cable at part load; unloaded in winter; full load", "5 degC", "90 degC"
            ),
            Tolerance.ABSOLUTE,
        ),
    ),
)

MOTORS = Group(
    "Contribution of motors at the fault",
    (
        Input(
            "I_mot",
            "current that running motors feed into the fault, r.m.s. (0 where there are none)",
            "current",
            ("kA", "A"),
            0.0,
            200e3,
            "motors that feed more than this are no motors",
            Demo("0.6 kA", "pump motors of the quay: sum of their starting currents"),
        ),
        Input(
            "rx_mot",
            "R / X of the motors",
            NUMBER,
            (),
            0.02,
            2.0,
            "0.10 to 0.42 in IEC 60909-0 (from memory)",
            Demo("0.15", "IEC 60909-0, motors above 1 kV, below 1 MW a pole pair"),
        ),
    ),
)

BREAKER = Group(
    "Switching device",
    (
        Input(
            "I_break",
            "rated short-circuit breaking current, r.m.s., symmetrical",
            "current",
            ("kA", "A"),
            100.0,
            300e3,
            "no circuit-breaker is rated outside this",
            Demo("25 kA", "name plate of the feeder's circuit-breaker"),
            rules=(
                Rule(
                    f"IF({_BY_TIME},TRUE,I_break>=4500)",
                    "is below 4.5 kA, where table 2 of IEC 60947-2 begins: choose the time "
                    "constant, and enter that of the maker's test",
                ),
            ),
        ),
        Input(
            "I_make",
            "rated short-circuit making current, peak",
            "current",
            ("kA", "A"),
            100.0,
            800e3,
            "no circuit-breaker is rated outside this",
            Demo("63 kA", "name plate of the feeder's circuit-breaker"),
        ),
        Input(
            "I_hold",
            "rated peak withstand current of the weakest part in the path",
            "current",
            ("kA", "A"),
            100.0,
            800e3,
            "no switchgear is rated outside this",
            Demo("63 kA", "name plate of the switchboard"),
        ),
        Input(
            "I_short",
            "rated short-time withstand current of the weakest part, r.m.s.",
            "current",
            ("kA", "A"),
            50.0,
            300e3,
            "no switchgear is rated outside this",
            Demo("25 kA", "name plate of the switchboard"),
        ),
        Input(
            "t_short",
            "time for which I_short is rated",
            "time",
            ("s", "ms"),
            0.01,
            10.0,
            "ratings are given for 1 s or 3 s, seldom for less",
            Demo("1 s", "name plate of the switchboard"),
        ),
        Choice(
            "rated_by",
            "what the ratings assume of the d.c. part",
            (BY_TIME, BY_FACTOR),
            Demo(BY_TIME, "name plate of the feeder's circuit-breaker"),
        ),
        Input(
            "tau_plate",
            "time constant that the ratings assume",
            "time",
            ("ms", "s"),
            1e-3,
            1.0,
            "45 ms is the standard value; special ones are 60 to 133 ms",
            Demo("45 ms", "IEC 62271-100, standard value"),
            needed=_BY_TIME,
        ),
        Input(
            "t_part",
            "time until the contacts part",
            "time",
            ("ms", "s"),
            1e-3,
            2.0,
            "contacts part after a few milliseconds at the earliest",
            Demo("60 ms", "protection study: relay 10 ms and opening time", "45 ms", "80 ms"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "t_clear",
            "longest time from the fault to the end of the current",
            "time",
            ("ms", "s"),
            5e-3,
            10.0,
            "heat flows away over longer times, and I2t no longer tells the temperature",
            Demo("350 ms", "protection study: back-up stage and arcing time"),
            rules=(
                Rule(
                    "t_clear>=t_part_hi",
                    "is shorter than the latest parting of the contacts: the current ends later",
                ),
                Rule(
                    "t_clear<=t_short",
                    "is longer than t_short, the time the withstand rating is given for: clear "
                    "faster, or enter the rating for a longer time",
                ),
            ),
        ),
    ),
)

_W = "2*PI()*f_net"


def _network(resistance: str, reactance: str) -> str:
    """Settled current of the network alone."""
    return f"c_max*U_net/SQRT(3)/SQRT({resistance}^2+{reactance}^2)"


def _most(resistance: str, reactance: str) -> str:
    """I2t of 1 A (r.m.s.) at the closing angle that gives most of it.

    Over the angle a the integral is a mean and a sine of 2a, so three angles tell all of it.
    """
    call = f"FO_FAULT_I2T(1,{resistance},{reactance},f_net,{{}},t_clear)"
    at_0, at_45, at_90 = (call.format(angle) for angle in (0, 45, 90))
    return f"(({at_0}+{at_90})/2+SQRT((({at_0}-{at_45})^2+({at_90}-{at_45})^2)/2))"


_R = "FO_RESISTANCE_AT(R_20,T_cond,metal)"
_NET = _network(_R, "X_net")
_ALPHA = 'IF(metal="copper",0.00393,0.00403)'

ASSUMED = Block(
    "What the ratings assume",
    (
        Quantity(
            "pf_table",
            "power factor of the test, IEC 60947-2",
            "INDEX(lv_factor,1+SUMPRODUCT((lv_upto<I_break)*1))",
            NUMBER,
            "table 2 of IEC 60947-2 by I_break (part 10); used only where rated_by says so",
        ),
        Quantity(
            "tau_rated",
            "time constant that the ratings assume",
            f"IF({_BY_TIME},tau_plate,SQRT(1/pf_table^2-1)/({_W}))",
            "time",
            "as entered, or tan(arccos(pf)) / (2 pi f)",
        ),
        Quantity(
            "I_belongs",
            "making current that belongs to I_break and tau_rated",
            f"SQRT(2)*I_break*FO_PEAK_FACTOR(1,{_W}*tau_rated)",
            "current",
            "sqrt(2) I_break x peak factor at R / X = 1 / (2 pi f tau_rated); for comparison",
        ),
        Quantity(
            "i_dc_ok",
            "d.c. part that the rating covers at the earliest parting",
            "SQRT(2)*I_break*EXP(-t_part_lo/tau_rated)",
            "current",
            "sqrt(2) I_break exp(-t_part,lo / tau_rated)",
        ),
    ),
)

NOMINAL = Block(
    "Circuit, nominal",
    (
        Quantity(
            "R_warm",
            "resistance at T_cond",
            _R,
            "resistance",
            "R_warm = R_20 (1 + alpha (T_cond - 20)), alpha 0.00393 copper, 0.00403 aluminium",
            f"R_20*(1+{_ALPHA}*(T_cond-20))",
        ),
        Quantity(
            "I_net",
            "settled current of the network, r.m.s.",
            _network("R_warm", "X_net"),
            "current",
            "I_net = c_max U_net / sqrt(3) / sqrt(R^2 + X^2)",
        ),
        Quantity(
            "tau_net",
            "time constant of the d.c. part",
            "FO_TAU_RX(R_warm,X_net,f_net)",
            "time",
            "tau = X / (2 pi f R)",
            f"X_net/({_W}*R_warm_hand)",
        ),
        Quantity(
            "kappa",
            "peak factor of the network",
            "FO_PEAK_FACTOR(R_warm,X_net)",
            NUMBER,
            "kappa = sqrt((cos u - e)^2 + sin^2 u), e = exp(-u R / X), at sin u = (R / X) "
            "(e - cos u); the second way solves this in the worksheet Tables",
            "SQRT((COS(INDEX(turn_nominal,7))-EXP(-R_warm_hand/X_net*INDEX(turn_nominal,7)))^2"
            "+SIN(INDEX(turn_nominal,7))^2)",
        ),
        Quantity(
            "kappa_mot",
            "peak factor of the motors",
            "FO_PEAK_FACTOR(rx_mot,1)",
            NUMBER,
            "the same with R / X = rx_mot",
            "SQRT((COS(INDEX(turn_motor,7))-EXP(-rx_mot*INDEX(turn_motor,7)))^2"
            "+SIN(INDEX(turn_motor,7))^2)",
        ),
        Quantity(
            "peak",
            "first peak at its worst angle, nominal",
            "SQRT(2)*(kappa*I_net+kappa_mot*I_mot)",
            "current",
            "peak = sqrt(2) (kappa I_net + kappa_mot I_mot), at closing angle 0°, where the "
            "voltage passes zero; both peaks counted as if at one moment, on the safe side",
            "SQRT(2)*(kappa_hand*c_max*U_net/SQRT(3)/SQRT(R_warm_hand^2+X_net^2)"
            "+kappa_mot_hand*I_mot)",
        ),
    ),
)

HIGHEST = Block(
    "Highest current: coldest conductor, R_20 and X_net at their lowest",
    (
        Quantity(
            "R_cold",
            "resistance, lowest",
            "FO_RESISTANCE_AT(R_20_lo,T_cond_lo,metal)",
            "resistance",
            "as R_warm, with R_20 and T_cond at their lowest",
        ),
        Quantity(
            "I_net_hi",
            "settled current of the network, highest",
            _network("R_cold", "X_net_lo"),
            "current",
            "as I_net, with R_cold and X_net,lo",
        ),
        Quantity(
            "I_sym",
            "settled symmetrical current, network and motors, highest",
            "I_net_hi+I_mot",
            "current",
            "I_sym = I_net,hi + I_mot; the motors' share is not let die away, on the safe side",
        ),
        Quantity(
            "S_fault",
            "fault level, highest",
            "SQRT(3)*U_net*I_sym",
            "apparent power",
            "S_fault = sqrt(3) U_net I_sym",
        ),
        Quantity(
            "t_peak",
            "time of the first peak",
            f"INDEX(turn_highest,7)/({_W})",
            "time",
            "t_peak = u / (2 pi f), u as for kappa with R_cold and X_net,lo",
        ),
        Quantity(
            "tau_hi",
            "time constant, longest",
            "MAX(FO_TAU_RX(R_cold,X_net_hi,f_net),IF(I_mot>0,FO_TAU_RX(rx_mot,1,f_net),0))",
            "time",
            "X_net,hi / (2 pi f R_cold), or that of the motors where it is longer",
            f"MAX(X_net_hi/({_W}*R_20_lo*(1+{_ALPHA}*(T_cond_lo-20))),"
            f"IF(I_mot>0,1/({_W}*rx_mot),0))",
        ),
    ),
)

DIRECT = Block(
    "D.c. part at contact parting, at its own worst angle",
    (
        Quantity(
            "phi",
            "angle of the impedance",
            "-FO_PHASE(f_net,tau_net)",
            "angle",
            "phi = arctan(X / R)",
            "180/PI()*ATAN(X_net/R_warm_hand)",
        ),
        Quantity(
            "a_dc",
            "closing angle with most d.c. part",
            "phi-90",
            "angle",
            "phi - 90°: at 0°, the angle of the highest peak, the d.c. part is smaller by sin(phi)",
        ),
        Quantity(
            "i_dc",
            "d.c. part at t_part, nominal",
            "FO_DC_WORST(t_part,I_net,R_warm,X_net,f_net)"
            "+I_mot*FO_DC_WORST(t_part,1,rx_mot,1,f_net)",
            "current",
            "i_dc = sqrt(2) (I_net exp(-t_part / tau) + I_mot exp(-2 pi f t_part rx_mot))",
            "SQRT(2)*(c_max*U_net/SQRT(3)/SQRT(R_warm_hand^2+X_net^2)*EXP(-t_part/tau_net_hand)"
            f"+I_mot*EXP(-{_W}*t_part*rx_mot))",
        ),
        Quantity(
            "i_dc_zero",
            "the same at the angle of the highest peak, for comparison",
            "FO_DC_OFFSET(t_part,I_net,R_warm,X_net,f_net,0)"
            "+I_mot*FO_DC_OFFSET(t_part,1,rx_mot,1,f_net,0)",
            "current",
            "sqrt(2) I_net sin(phi) exp(-t_part / tau) and the motors' share; not used in a check",
        ),
        Quantity(
            "q_part",
            "help for X_most",
            f"(1/({_W}*t_part_lo)/2+SQRT((1/({_W}*t_part_lo))^2/4+1/27))^(1/3)",
            NUMBER,
            "q = (w / 2 + sqrt(w^2 / 4 + 1 / 27))^(1/3), w = 1 / (2 pi f t_part,lo)",
        ),
        Quantity(
            "X_most",
            "reactance with most d.c. part at t_part,lo",
            "R_cold/(q_part-1/(3*q_part))",
            "resistance",
            "R / X solves r^3 + r = 1 / (2 pi f t_part): less reactance gives more current, more "
            "reactance a slower decay; sought between the limits of X_net in part 6",
        ),
    ),
)

HEAT = Block(
    "Heat until the current ends, at its own worst angle",
    (
        Quantity(
            "W_net",
            "I2t of the network, nominal",
            f"I_net^2*{_most('R_warm', 'X_net')}",
            "square integral",
            "integral of i^2 until t_clear at the angle with most of it: over the angle it is a "
            "mean and a double-angle sine, which three angles fix",
            "2*(c_max*U_net/SQRT(3)/SQRT(R_warm_hand^2+X_net^2))^2*INDEX(heat_most,1)",
        ),
        Quantity(
            "W_one",
            "I2t of 1 A from the motors",
            _most("rx_mot", "1"),
            "square integral",
            "the same with R / X = rx_mot and no dying away of the settled part",
            "2*INDEX(heat_most,2)",
        ),
        Quantity(
            "I_th",
            "current of the same heat over t_short, nominal",
            "(SQRT(W_net)+I_mot*SQRT(W_one))/SQRT(t_short)",
            "current",
            "I_th = (sqrt(W_net) + I_mot sqrt(W_one)) / sqrt(t_short): the roots of the integrals "
            "add up at most",
            "(SQRT(W_net_hand)+I_mot*SQRT(W_one_hand))/SQRT(t_short)",
        ),
    ),
)


def _newton(name: str, ratio: str, first: bool) -> str:
    """One step towards sin u = (R/X) (e - cos u), from pi - arctan(R/X)."""
    if first:
        return f"PI()-ATAN({ratio})"
    u = f"above_{name}"
    decayed = f"EXP(-{ratio}*{u})"
    value = f"(SIN({u})-{ratio}*({decayed}-COS({u})))"
    slope = f"(COS({u})+{ratio}^2*{decayed}-{ratio}*SIN({u}))"
    return f"{u}-{value}/{slope}"


_TURNS = {
    "nominal": "(R_warm_hand/X_net)",
    "highest": f"(R_20_lo*(1+{_ALPHA}*(T_cond_lo-20))/X_net_lo)",
    "motor": "rx_mot",
}

TURN = Formed(
    "turn",
    tuple(_TURNS),
    tuple(
        tuple(_newton(name, ratio, step == 0) for name, ratio in _TURNS.items())
        for step in range(7)
    ),
)
"""The angle u of the first peak by Newton's method, in rad."""

_BOTH = "(1+1/here_rx^2)"


def _heat_row(ratio: str) -> tuple[str, ...]:
    """Integrals over the parts of (i / (sqrt(2) I))^2 in closed form."""
    tau = f"(1/({_W}*here_rx))"
    return (
        ratio,
        f"{_W}*t_clear",
        f"EXP(-{_W}*t_clear*here_rx)",
        f"{tau}*(1-here_left*(COS(here_end)-SIN(here_end)/here_rx))/{_BOTH}",
        f"{tau}*(1/here_rx-here_left*(SIN(here_end)+COS(here_end)/here_rx))/{_BOTH}",
        f"t_clear/2+SIN(2*here_end)/(4*{_W})-2*here_in_step+{tau}/2*(1-here_left^2)",
        f"t_clear/2-SIN(2*here_end)/(4*{_W})",
        f"SIN(here_end)^2/(2*{_W})-here_across",
        "(here_cosine+here_sine)/2+SQRT(((here_cosine-here_sine)/2)^2+here_mixed^2)",
    )


HEATS = Formed(
    "heat",
    ("rx", "end", "left", "in_step", "across", "cosine", "sine", "mixed", "most"),
    (_heat_row("R_warm_hand/X_net"), _heat_row("rx_mot")),
)
"""I2t by hand: network and motors."""

WORST = (
    WorstCase(
        "peak",
        f"SQRT(2)*({_NET}*FO_PEAK_FACTOR({_R},X_net)+kappa_mot*I_mot)",
        (Varies("R_20"), Varies("X_net"), Varies("T_cond")),
        draws=60,
    ),
    WorstCase(
        "i_dc",
        f"FO_DC_WORST(t_part,{_NET},{_R},X_net,f_net)+I_mot*FO_DC_WORST(t_part,1,rx_mot,1,f_net)",
        (Varies("R_20"), Varies("X_net", inside="X_most"), Varies("T_cond"), Varies("t_part")),
        draws=60,
        seed=2,
    ),
    WorstCase(
        "I_th",
        f"({_NET}*SQRT({_most(_R, 'X_net')})+I_mot*SQRT(W_one))/SQRT(t_short)",
        (Varies("R_20"), Varies("X_net"), Varies("T_cond")),
        draws=30,
        seed=3,
    ),
)

CHECKS = (
    Check(
        "making",
        "First peak, closing onto the fault",
        "peak_max",
        "I_make",
        "current",
        "Rated making current; closing at 0°, where the voltage passes zero",
    ),
    Check(
        "withstand",
        "First peak, parts in the path",
        "peak_max",
        "I_hold",
        "current",
        "Rated peak withstand current of the weakest part",
    ),
    Check(
        "breaking",
        "Settled current to be broken",
        "I_sym",
        "I_break",
        "current",
        "Rated breaking current; fault level {S_fault}",
    ),
    Check(
        "direct",
        "D.c. part at contact parting",
        "i_dc_max",
        "i_dc_ok",
        "current",
        "What the rating covers at the earliest parting, {t_part_lo}; own worst angle phi - 90°. "
        "IEC 62271-100, confirm against the edition in force.",
    ),
    Check(
        "decay",
        "Time constant of the d.c. part",
        "tau_hi",
        "tau_rated",
        "time",
        "What the rating assumes; beyond it the maker decides, even at a lower current",
    ),
    Check(
        "heat",
        "Current of the same I2t over t_short",
        "I_th_max",
        "I_short",
        "current",
        "Rated short-time withstand current for {t_short}; all heat kept in the conductor",
    ),
)

HAZARDS = (
    Hazard(
        "Angle of the peak",
        "i_dc_zero<0.99*i_dc",
        "At the angle of the highest peak the d.c. part would be {i_dc_zero}, at its own worst "
        "angle it is {i_dc}: never take one angle for both.",
    ),
    Hazard(
        "Motors left out",
        "I_mot=0",
        "No contribution of motors is entered; motors that run when the fault begins feed it.",
    ),
    Hazard(
        "Conductor taken warm",
        "T_cond_lo>20",
        "The coldest conductor is taken at {T_cond_lo}; the highest current flows at 20 °C or "
        "below (IEC 60909-0 takes 20 °C).",
    ),
    Hazard(
        "Voltage factor",
        "c_max<1.05",
        "The voltage factor is below 1.05, the least for a highest current (IEC 60909-0, table 1, "
        "from memory).",
    ),
    Hazard(
        "Ratings at odds",
        "ABS(I_make/I_belongs-1)>0.1",
        "The making current differs by more than a tenth from {I_belongs}, which belongs to "
        "I_break and tau_rated: look at the name plate again.",
    ),
    Hazard(
        "Contacts part before the peak",
        "t_part_lo<t_peak",
        "The contacts part before the first peak at {t_peak}: a device that limits the current is "
        "not what this sheet describes.",
    ),
)

_MOTOR = "+I_mot*FO_FAULT_CURRENT(t,1,rx_mot,1,f_net,{})"

CURVE = Curve(
    end="MAX(4/f_net,1.05*t_part_lo)",
    time_unit="ms",
    quantity="current",
    unit="kA",
    y_title="current",
    caption="Fault at 0, highest current: coldest conductor, R_20 and X_net at their lowest. The "
    "mark counts both peaks as if at one moment, so it may stand a little above the curve.",
    traces=(
        Trace(
            "closed for the highest peak, 0°",
            "FO_FAULT_CURRENT(t,I_net_hi,R_cold,X_net_lo,f_net,0)" + _MOTOR.format("0"),
        ),
        Trace(
            "most d.c. part, own angle",
            "FO_DC_WORST(t,I_net_hi,R_cold,X_net_lo,f_net)+I_mot*FO_DC_WORST(t,1,rx_mot,1,f_net)",
        ),
    ),
    levels=(Level("making current", "I_make"),),
    moments=(Moment("contacts part, earliest", "t_part_lo"),),
    marks=(Mark("first peak, worst case", "t_peak", "peak_max"),),
    points=160,
    from_zero=False,
)

CAUTIONS = (
    Caution(
        "An arc kills at a distance",
        "A fault throws out metal, light and pressure. Keep people away from switchgear that is "
        "being closed onto an unproven circuit, operate from afar, and wear what the arc-flash "
        "study asks for.",
    ),
    Caution(
        "A breaker beyond its rating bursts",
        "Making, breaking and withstand hold together: one exceeded is enough. Do not close, and "
        "do not trust the protection, until the fault level has been brought down.",
    ),
    Caution(
        "Isolate, prove dead, earth",
        "Before work on the circuit: isolate, lock off, prove dead at the point of work with a "
        "tester proved before and after, then earth and short. Earths must carry the fault "
        "current of this sheet until it is cleared.",
    ),
    Caution(
        "The network grows",
        "The utility's fault level rises with every transformer and generator added, and with a "
        "closed bus coupler. Ask for the highest that is planned, and calculate anew.",
    ),
    Caution(
        "Lowest current is another question",
        "Protection must also see the smallest fault current: hot conductors, far end, weakest "
        "infeed. This sheet does not answer that.",
    ),
)

BASIS = Basis(
    method=(
        "A sine voltage switched onto R and X: i(t) = sqrt(2) I (sin(w t + a - phi) - sin(a - phi) "
        "exp(-t / tau)). The first peak is highest at a = 0°, the d.c. part at a = phi - 90°, I2t "
        "at an angle of its own; each result takes its own.",
        "Every check takes the worst corner of R_20, X_net, T_cond and t_part; for the d.c. part "
        "the reactance with most of it is sought between its limits.",
        "The motors' peak, d.c. part and heat are added to the network's as if at one moment and "
        "without dying away of their settled part, which is on the safe side.",
        "While tau_hi is at most tau_rated, the d.c. part is nearest to what the rating covers at "
        "the earliest parting; where it is longer the check on the time constant fails.",
    ),
    assumptions=(
        "A three-phase fault without impedance, far from generators: the settled current does not "
        "fall. All of the resistance has the temperature of the conductor.",
        "No current flows before the fault. R and X are constant, in series.",
        "The withstand rating holds for the same I2t in a shorter time, down to the first peak.",
    ),
    sources=(
        "Voltage factor, conductors at 20 °C, motors: IEC 60909-0, from memory. Its peak factor "
        "1.02 + 0.98 exp(-3 R/X) comes within 0.6 % of the exact one used here.",
        "Rated d.c. part, 45 ms: IEC 62271-100. Power factors: IEC 60947-2, table 2, below. "
        "Confirm all against the edition in force.",
        "Temperature coefficients: IEC 60028 for copper; IEC 60889 for aluminium, from memory.",
    ),
    not_covered=(
        "Faults near generators, missing current zeros, faults to earth (which can exceed the "
        "three-phase fault near a transformer), parallel infeeds of unlike R / X, fuses and "
        "current-limiting breakers, arc-flash energy, forces on busbars, smallest fault current.",
    ),
)

_UPTO = (6e3, 10e3, 20e3, 50e3, 1e9)
_FACTOR = (0.7, 0.5, 0.3, 0.25, 0.2)

SHEET = Sheet(
    name="fault",
    title="Fault current",
    question="what is the first peak of a fault current, and how does its d.c. part die away?",
    purpose="To show that the switching device and the parts in the path bear the first peak, the "
    "settled current, its d.c. part at contact parting and the heat of a three-phase fault.",
    picture=Picture(
        "fault.png",
        "The fault closes at t = 0, at the worst angle of the voltage. One phase is drawn; the "
        "contacts part at t_part, and the current ends at t_clear.",
    ),
    groups=(NETWORK, MOTORS, BREAKER),
    blocks=(ASSUMED, NOMINAL, HIGHEST, DIRECT, HEAT),
    worst_cases=WORST,
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-009",
        "Crane feeder, 10 kV: fault current",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
    tables=(
        Table(
            "lv",
            "Power factor of the short-circuit test (IEC 60947-2, table 2)",
            (
                Column("upto", "I_break up to", _UPTO),
                Column("factor", "power factor", _FACTOR),
                Column(
                    "shown",
                    "rated breaking current",
                    ("4.5 to 6 kA", "to 10 kA", "to 20 kA", "to 50 kA", "above 50 kA"),
                    2,
                ),
                Column("shown_factor", "power factor", tuple(f"{x:g}" for x in _FACTOR), 2),
                Column("making", "making / breaking", ("1.5", "1.7", "2.0", "2.1", "2.2"), 2),
            ),
        ),
    ),
    formed=(TURN, HEATS),
)
"""The calc sheet."""
