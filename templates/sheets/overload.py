"""When does a thermal overload trip, from cold and from hot?

A relay that models one thermal body with one time constant while the motor runs and another one
while it stands. Heat is counted in squares of the current; the relay trips at that of its pick-up
current. Motor limits that need a trip take the slowest relay, what must not trip the fastest.
"""

from __future__ import annotations

from tausheet.templates.model import (
    NUMBER,
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

MOTOR = Group(
    "Motor",
    (
        Input(
            "I_rated",
            "rated current",
            "current",
            ("A", "mA", "kA"),
            0.01,
            20e3,
            "no motor with a thermal overload is rated outside this",
            Demo("198 A", "name plate of the hoist motor, 110 kW, 400 V"),
        ),
        Input(
            "dT_rated",
            "temperature rise of the winding at I_rated",
            "temperature difference",
            ("K",),
            10.0,
            200.0,
            "no insulation allows more, and less is a slip",
            Demo("80 K", "test report of the motor, by resistance"),
        ),
        Input(
            "T_limit",
            "highest temperature that the winding bears",
            "temperature",
            ("degC",),
            80.0,
            300.0,
            "insulation classes are from 105 to 250 °C",
            Demo("155 degC", "name plate: thermal class 155 (F)"),
        ),
        Input(
            "T_amb",
            "ambient temperature of the motor",
            "temperature",
            ("degC",),
            -50.0,
            75.0,
            "motors run between these",
            Demo("30 degC", "machinery house, heated and ventilated", "15 degC", "45 degC"),
            Tolerance.ABSOLUTE,
        ),
    ),
)

RELAY = Group(
    "Overload relay",
    (
        Input(
            "I_set",
            "setting",
            "current",
            ("A", "mA", "kA"),
            0.01,
            20e3,
            "no motor with a thermal overload is rated outside this",
            Demo("198 A", "relay settings list"),
        ),
        Input(
            "k_pick",
            "pick-up current over setting",
            NUMBER,
            (),
            1.0,
            1.5,
            "it is 1.05 to 1.2 as a rule",
            Demo("1.1", "relay settings list, accuracy 5 %", "1.045", "1.155"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "tau_heat",
            "heating time constant, motor running",
            "time",
            ("min", "s"),
            1.0,
            36000.0,
            "an overload relay is set between these",
            Demo("7 min", "relay settings list, accuracy 5 %", "-5 %", "5 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "tau_cool",
            "cooling time constant, motor at rest",
            "time",
            ("min", "s"),
            1.0,
            360000.0,
            "a motor at rest cools within minutes to days",
            Demo("28 min", "motor maker: four times that of running", "-10 %", "20 %"),
            Tolerance.PERCENT,
        ),
        Choice(
            "corrected",
            "relay measures the ambient temperature and corrects for it",
            ("yes", "no"),
            Demo("yes", "relay settings list, sensor in the machinery house"),
        ),
        Input(
            "T_ref",
            "ambient temperature for which the setting holds",
            "temperature",
            ("degC",),
            0.0,
            75.0,
            "settings are for 20 to 60 °C, 40 °C as a rule",
            Demo("40 degC", "relay settings list"),
            rules=(
                Rule(
                    "T_ref+10<=T_limit",
                    "leaves less than 10 K to T_limit: no correction can be reckoned with",
                ),
            ),
        ),
    ),
)

LOADS = Group(
    "Loads",
    (
        Input(
            "I_prior",
            "load just before the overload",
            "current",
            ("A", "mA", "kA"),
            0.0,
            20e3,
            "no motor with a thermal overload carries more for long",
            Demo("150 A", "duty of the hoist, r.m.s. over a cycle", "0 A", "170 A"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "t_prior",
            "time for which I_prior has flowed",
            "time",
            ("min", "s", "h"),
            0.0,
            360000.0,
            "after a hundred hours every motor is in equilibrium",
            Demo("45 min", "duty of the hoist, shortest shift"),
        ),
        Input(
            "I_before",
            "load before that, in equilibrium (0 from cold)",
            "current",
            ("A", "mA", "kA"),
            0.0,
            20e3,
            "no motor with a thermal overload carries more for long",
            Demo("0 A", "first shift, motor cold"),
        ),
        Input(
            "I_act",
            "overload to be judged",
            "current",
            ("A", "mA", "kA"),
            0.01,
            200e3,
            "no overload is outside this",
            Demo("317 A", "hoist stalled in a snag: torque limit, 1.6 x rated", "310 A", "325 A"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "t_most",
            "time for which the motor bears I_act, from cold",
            "time",
            ("min", "s"),
            0.1,
            36000.0,
            "an overload is borne from a fraction of a second to hours",
            Demo("10 min", "motor maker's overload curve, from cold"),
        ),
        Input(
            "t_duty",
            "time for which I_act has to be carried, from hot",
            "time",
            ("s", "min"),
            0.0,
            36000.0,
            "longer than ten hours is no overload",
            Demo("45 s", "duty of the hoist: test load, full height"),
        ),
    ),
)

START = Group(
    "Starting and locked rotor",
    (
        Input(
            "I_start",
            "starting current, locked rotor",
            "current",
            ("A", "mA", "kA"),
            0.01,
            200e3,
            "no motor draws a starting current outside this",
            Demo("990 A", "motor maker; mains -7 % to +5 %", "920 A", "1045 A"),
            Tolerance.ABSOLUTE,
            (
                Rule(
                    "I_start_lo>=1.5*I_rated",
                    "falls below 1.5 x I_rated: that is no locked rotor on the mains",
                ),
            ),
        ),
        Input(
            "t_start",
            "longest run-up time",
            "time",
            ("s", "min"),
            0.01,
            600.0,
            "no run-up takes more than ten minutes",
            Demo("2.5 s", "commissioning record, line-fed bypass, empty hook"),
            rules=(
                Rule("t_start<=t_lock_hot", "is longer than the rotor bears when it is locked hot"),
            ),
        ),
        Input(
            "t_lock_cold",
            "time for which the locked rotor bears I_start, from cold",
            "time",
            ("s",),
            0.1,
            1000.0,
            "a locked rotor is burnt within seconds to minutes",
            Demo("40 s", "motor maker's data sheet"),
        ),
        Input(
            "t_lock_hot",
            "the same from the temperature of rated load",
            "time",
            ("s",),
            0.1,
            1000.0,
            "a locked rotor is burnt within seconds to minutes",
            Demo("20 s", "motor maker's data sheet"),
            rules=(
                Rule(
                    "t_lock_hot<=t_lock_cold",
                    "is longer than t_lock_cold: the two are exchanged",
                ),
            ),
        ),
        Input(
            "t_wait",
            "pause after a trip before the motor is started again",
            "time",
            ("min", "s", "h"),
            0.0,
            360000.0,
            "nobody waits longer than a hundred hours",
            Demo("15 min", "operating instructions of the crane"),
        ),
    ),
)


def _pickup(factor: str, ambient: str) -> str:
    """Pick-up current: the setting, and what the ambient makes of it."""
    share = f"(T_limit-{ambient})/(T_limit-T_ref)"
    return f'({factor}*I_set*IF(corrected="yes",SQRT({share}),1))'


def _restart_heat(start: str, pickup: str, tau: str) -> str:
    """Share of the trip's heat at which a start just does not trip."""
    return f"(1-(({start}/{pickup})^2-1)*(EXP(t_start/{tau})-1))"


def _by_hand(pickup: str, tau: str, prior: str, current: str) -> str:
    """Trip time with built-in functions."""
    time = f"{tau}*LN(({current}^2-{prior}^2)/({current}^2-{pickup}^2))"
    return f"IF({prior}>={pickup},0,IF({current}>{pickup},{time},NA()))"


_IK = _pickup("k_pick", "T_amb")
_PRIOR = "SQRT(I_prior^2+MAX(0,I_before^2-I_prior^2)*EXP(-t_prior/tau_heat_hi))"

PICKUP = Block(
    "Pick-up current",
    (
        Quantity(
            "I_pick",
            "pick-up current, nominal",
            _IK,
            "current",
            "I_pick = k_pick I_set, with correction x sqrt((T_limit - T_amb) / (T_limit - T_ref))",
        ),
        Quantity(
            "I_pick_lo",
            "pick-up current, lowest",
            _pickup("k_pick_lo", "T_amb_hi"),
            "current",
            "k_pick at its lowest, T_amb at its highest",
        ),
        Quantity(
            "I_pick_hi",
            "pick-up current, highest",
            _pickup("k_pick_hi", "T_amb_lo"),
            "current",
            "k_pick at its highest, T_amb at its lowest",
        ),
        Quantity(
            "T_pick",
            "winding at a current that never trips, hottest",
            f"MAX(T_amb_lo+dT_rated*({_pickup('k_pick_hi', 'T_amb_lo')}/I_rated)^2,"
            f"T_amb_hi+dT_rated*({_pickup('k_pick_hi', 'T_amb_hi')}/I_rated)^2)",
            "temperature",
            "T_pick = T_amb + dT_rated (I_pick / I_rated)^2, k_pick at its highest; the hotter of "
            "both ends of T_amb (a straight line in between)",
        ),
    ),
)

TRIP = Block(
    "Trip times, nominal",
    (
        Quantity(
            "I_hot",
            "earlier load that counts for the heat",
            _PRIOR,
            "current",
            "I_hot^2 = I_prior^2 + (I_before^2 - I_prior^2) exp(-t_prior / tau_heat,hi), never "
            "less than I_prior^2, on the safe side for what must not trip",
        ),
        Quantity(
            "t_cold",
            "trip time at I_act, from cold",
            "FO_TRIP_TIME(I_pick,tau_heat,0,I_act)",
            "time",
            "t = tau_heat ln(I_act^2 / (I_act^2 - I_pick^2))",
            _by_hand("I_pick", "tau_heat", "0", "I_act"),
        ),
        Quantity(
            "t_hot",
            "trip time at I_act, from the earlier load",
            "FO_TRIP_TIME(I_pick,tau_heat,I_hot,I_act)",
            "time",
            "t = tau_heat ln((I_act^2 - I_hot^2) / (I_act^2 - I_pick^2)), 0 where I_hot has "
            "tripped already",
            _by_hand("I_pick", "tau_heat", "I_hot", "I_act"),
        ),
    ),
)

STARTING = Block(
    "Starting and locked rotor, worst case",
    (
        Quantity(
            "I_hot_hi",
            "earlier load that counts, highest",
            _PRIOR.replace("I_prior", "I_prior_hi"),
            "current",
            "as I_hot, I_prior at its highest",
        ),
        Quantity(
            "t_run",
            "trip time in a start from hot, shortest",
            "FO_TRIP_TIME(I_pick_lo,tau_heat_lo,I_hot_hi,I_start_hi)",
            "time",
            "as t_hot with I_pick and tau_heat at their lowest, I_hot and I_start at their highest",
            _by_hand("I_pick_lo", "tau_heat_lo", "I_hot_hi", "I_start_hi"),
        ),
        Quantity(
            "t_stall",
            "trip time of a locked rotor from cold, longest",
            "FO_TRIP_TIME(I_pick_hi,tau_heat_hi,0,I_start_lo)",
            "time",
            "as t_cold with I_pick and tau_heat at their highest, I_start at its lowest",
            _by_hand("I_pick_hi", "tau_heat_hi", "0", "I_start_lo"),
        ),
        Quantity(
            "t_stall_hot",
            "the same from rated load, longest",
            "FO_TRIP_TIME(I_pick_hi,tau_heat_hi,I_rated,I_start_lo)",
            "time",
            "as t_hot with I_rated as the earlier load, for which t_lock_hot holds",
            _by_hand("I_pick_hi", "tau_heat_hi", "I_rated", "I_start_lo"),
        ),
    ),
)

RESTART = Block(
    "Cooling to restart, nominal",
    (
        Quantity(
            "q_ok",
            "heat at which a start just does not trip, over that of the trip",
            _restart_heat("I_start", "I_pick", "tau_heat"),
            "ratio",
            "q_ok = 1 - ((I_start / I_pick)^2 - 1) (exp(t_start / tau_heat) - 1); below 0 not even "
            "a cold start succeeds",
        ),
        Quantity(
            "t_restart",
            "time to cool from the trip until a start succeeds",
            "FO_TIME_UNTIL_BELOW(q_ok,tau_cool,1,0)",
            "time",
            "t_restart = tau_cool ln(1 / q_ok)",
            "tau_cool*MAX(0,LN(1/q_ok))",
        ),
        Quantity(
            "t_same",
            "the same if cooling were as fast as heating, for comparison",
            "FO_TIME_UNTIL_BELOW(q_ok,tau_heat,1,0)",
            "time",
            "tau_heat ln(1 / q_ok): a motor at rest has no fan; not used in a check",
        ),
    ),
)

WORST = (
    WorstCase(
        "t_cold",
        f"FO_TRIP_TIME({_IK},tau_heat,0,I_act)",
        (Varies("k_pick"), Varies("T_amb"), Varies("tau_heat"), Varies("I_act")),
        draws=100,
    ),
    WorstCase(
        "t_hot",
        f"FO_TRIP_TIME({_IK},tau_heat,{_PRIOR},I_act)",
        (
            Varies("k_pick"),
            Varies("T_amb"),
            Varies("tau_heat"),
            Varies("I_prior"),
            Varies("I_act"),
        ),
        draws=100,
        seed=2,
    ),
    WorstCase(
        "t_restart",
        f"FO_TIME_UNTIL_BELOW({_restart_heat('I_start', _IK, 'tau_heat')},tau_cool,1,0)",
        (
            Varies("k_pick"),
            Varies("T_amb"),
            Varies("tau_heat"),
            Varies("tau_cool"),
            Varies("I_start"),
        ),
        draws=100,
        seed=3,
    ),
)

CHECKS = (
    Check(
        "trip",
        "Trip at I_act from cold, latest",
        "t_cold_max",
        "t_most",
        "time",
        "Motor maker's overload curve",
    ),
    Check(
        "duty",
        "Trip at I_act from hot, earliest",
        "t_hot_min",
        "t_duty",
        "time",
        "The duty has to be carried without a trip",
        Sense.AT_LEAST,
    ),
    Check(
        "start",
        "Trip in a start from hot, earliest",
        "t_run",
        "t_start",
        "time",
        "The motor has to run up without a trip",
        Sense.AT_LEAST,
    ),
    Check(
        "lock_cold",
        "Trip of a locked rotor from cold, latest",
        "t_stall",
        "t_lock_cold",
        "time",
        "Motor maker's data at rated voltage, held against the lowest current, on the safe side",
    ),
    Check(
        "lock_hot",
        "Trip of a locked rotor from hot, latest",
        "t_stall_hot",
        "t_lock_hot",
        "time",
        "Motor maker's data at rated voltage, held against the lowest current, on the safe side",
    ),
    Check(
        "restart",
        "Cooling until a start succeeds, longest",
        "t_restart_max",
        "t_wait",
        "time",
        "Pause of the operating instructions; the motor cools at rest, with tau_cool",
    ),
    Check(
        "winding",
        "Winding at a current that never trips",
        "T_pick",
        "T_limit",
        "temperature",
        "Thermal class of the insulation, ambient from {T_amb_lo} to {T_amb_hi}",
    ),
    Check(
        "rated",
        "Pick-up current, lowest",
        "I_pick_lo",
        "I_rated",
        "current",
        "Rated load has to be carried for ever; where it fails at a high ambient, the motor has to "
        "be loaded less",
        Sense.AT_LEAST,
    ),
)

HAZARDS = (
    Hazard(
        "Cooling taken as heating",
        "tau_cool_lo<1.5*tau_heat_hi",
        "The cooling time constant is hardly longer than the heating one. At rest the fan stands: "
        "the motor cools two to five times slower than it heats, and a restart finds it hotter "
        "than the relay believes.",
    ),
    Hazard(
        "Earlier load not in equilibrium",
        "EXP(-t_prior/tau_heat_hi)>0.05",
        "After {t_prior} the heat still moves. Trips from hot are reckoned with {I_hot_hi} in "
        "equilibrium, the most it can be; the true time lies between cold and hot.",
    ),
    Hazard(
        "Ambient not corrected",
        'AND(corrected="no",T_amb_hi>T_ref)',
        "The relay takes {T_ref} for the ambient, the motor stands in up to {T_amb_hi}: a current "
        "that never trips heats the winding to {T_pick}.",
    ),
    Hazard(
        "Set above rated",
        "I_set>I_rated",
        "The relay is set to {I_set}, above the rated current of {I_rated}.",
    ),
    Hazard(
        "Hot start has little room",
        "t_run<1.2*t_start",
        "A hot start trips after {t_run} at the earliest and may take {t_start}: a low mains "
        "voltage makes it longer.",
    ),
)

_SLOW = "FO_STEP(t,tau_heat_hi,0,(I_act_lo/I_pick_hi)^2)"
_FAST = "FO_STEP(t,tau_heat_lo,(I_hot_hi/I_pick_lo)^2,(I_act_hi/I_pick_lo)^2)"

CURVE = Curve(
    end="MAX(t_most,1.4*t_cold_max)",
    time_unit="min",
    quantity="ratio",
    unit="%",
    y_title="heat over that of the trip",
    caption="I_act flows from 0 on; after the trip the motor stands and cools. The latest trip "
    "starts cold with the slowest relay, the earliest starts hot with the fastest.",
    traces=(
        Trace(
            "latest, from cold",
            f"IF(t<=t_cold_max,{_SLOW},FO_NATURAL(t-t_cold_max,tau_cool_hi,1))",
        ),
        Trace(
            "earliest, from hot",
            f"IF(t<=t_hot_min,{_FAST},FO_NATURAL(t-t_hot_min,tau_cool_lo,1))",
        ),
    ),
    levels=(Level("trip", "1"),),
    moments=(Moment("must have tripped", "t_most"), Moment("must not have tripped", "t_duty")),
    marks=(
        Mark("latest trip", "t_cold_max", "IF(ISNUMBER(t_cold_max),1,NA())"),
        Mark("earliest trip", "t_hot_min", "IF(ISNUMBER(t_hot_min),1,NA())"),
    ),
    points=160,
)

CAUTIONS = (
    Caution(
        "A relay knows the current, not the winding",
        "Blocked air, a fan at low speed, a lost phase, a dirty heat sink or frequent braking heat "
        "a motor that draws no overload. Sensors in the winding see it; a relay does not.",
    ),
    Caution(
        "Memory lost, danger kept",
        "Many relays forget the heat when their supply is switched off. A reset that way lets a "
        "hot motor start as if cold: never reset by cutting the supply.",
    ),
    Caution(
        "Find the cause before the restart",
        "A trip has a reason. Isolate, lock off and look before the motor is started again; on a "
        "hoist secure the load first, since the brake may be all that holds it.",
    ),
    Caution(
        "Automatic restart",
        "Never let a reset by itself start a machine where somebody may stand in it.",
    ),
    Caution(
        "Not against short circuits",
        "An overload relay breaks no fault current. Fuses or a breaker before it must, within what "
        "relay and contactor withstand.",
    ),
    Caution(
        "Hot surfaces",
        "After a trip the motor is near its highest temperature and cools slowly: keep hands off, "
        "and beware of grease and dust that may burn.",
    ),
)

BASIS = Basis(
    method=(
        "One thermal body: heat H follows the current squared, tau dH/dt = I^2 - H, and the relay "
        "trips at H = I_pick^2. From cold t = tau ln(I^2 / (I^2 - I_pick^2)), from an earlier load "
        "t = tau ln((I^2 - I_hot^2) / (I^2 - I_pick^2)).",
        "Limits of the motor are held against the slowest relay, loads to be carried against the "
        "fastest: every corner of pick-up, ambient, time constants and currents.",
        "After the trip the current is 0 and H falls with tau_cool. A start succeeds while its own "
        "heat, with tau_heat over t_start, stays below the trip.",
        "Ambient correction: the pick-up current squared is proportional to T_limit - T_amb.",
    ),
    assumptions=(
        "The starting current flows unchanged for the whole of t_start.",
        "Before I_prior the motor was in equilibrium at I_before. In the heat that counts, I_prior "
        "is in equilibrium even where it has flowed for a short time only.",
        "Symmetrical sine currents; the relay measures the true r.m.s. value.",
        "Times that the motor bears are for the insulation and the rotor as the maker states them.",
    ),
    sources=(
        "Cold and hot curves: IEC 60255-149 (the equations' numbers not confirmed). Confirm "
        "against the edition in force.",
        "Thermal classes: IEC 60085. Slower cooling at rest, settings and pick-up factors: common "
        "practice.",
    ),
    not_covered=(
        "Trip classes of relays without a stated time constant, unbalance and lost phase, "
        "harmonics, rotors that heat unevenly, several starts in a row, intermittent duty, relays "
        "that lock out a restart at a heat of their own, protection by sensors in the winding.",
    ),
)

SHEET = Sheet(
    name="overload",
    title="Thermal overload of a motor",
    question="when does a thermal overload trip, from cold and from hot?",
    purpose="To show that the overload relay trips before the motor is too hot, lets it carry its "
    "duty and run up, and that the motor can be started again after the pause.",
    picture=Picture(
        "overload.png",
        "The overload begins at t = 0 and ends with the trip. Then the motor stands and cools "
        "until it is started again.",
    ),
    groups=(MOTOR, RELAY, LOADS, START),
    blocks=(PICKUP, TRIP, STARTING, RESTART),
    worst_cases=WORST,
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-011",
        "Hoist motor: thermal overload",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
)
"""The calc sheet."""
