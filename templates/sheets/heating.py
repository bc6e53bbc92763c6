"""How hot does a braking resistor or a motor get in intermittent duty?

One thermal body, or two in series of which the rises add up: each a first-order response to the
square of power, in closed form at every cycle's end and when settled.
"""

from __future__ import annotations

from tausheet.templates.model import (
    COUNT,
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
    Picture,
    Quantity,
    Rule,
    Sheet,
    Tolerance,
    Trace,
    Varies,
    WorstCase,
)

TWO = 'bodies="two"'

DUTY = Group(
    "Duty",
    (
        Input(
            "P_on",
            "power turned into heat during the on-time",
            "power",
            ("kW", "W", "MW"),
            1e-3,
            1e9,
            "nothing that this sheet is for turns less or more into heat",
            Demo("30 kW", "lowering of the rated load, drive retrofit", "-10 %", "10 %"),
            Tolerance.PERCENT,
            (
                Rule(
                    "P_on_lo>P_off",
                    "is not always above P_off: the on-time is the one with the greater power",
                ),
            ),
        ),
        Input(
            "P_off",
            "power during the off-time, highest",
            "power",
            ("W", "kW"),
            0.0,
            1e9,
            "it heats, so it is not negative",
            Demo("0 W", "the chopper is off"),
        ),
        Input(
            "t_on",
            "on-time of a cycle",
            "time",
            ("s", "min", "ms", "h"),
            1e-3,
            1e6,
            "shorter ones are not seen by the temperature, longer ones are no cycle",
            Demo("12 s", "duty cycle of the crane", "-10 %", "10 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "t_off",
            "off-time of a cycle",
            "time",
            ("s", "min", "ms", "h"),
            1e-3,
            1e6,
            "shorter ones are not seen by the temperature, longer ones are no cycle",
            Demo("108 s", "duty cycle of the crane", "-10 %", "10 %"),
            Tolerance.PERCENT,
        ),
    ),
)

BODY = Group(
    "Thermal body",
    (
        Choice(
            "bodies",
            "thermal bodies whose rises add up",
            ("one", "two"),
            Demo("two", "heat run of the braking resistor: element and housing"),
        ),
        Input(
            "R_one",
            "thermal resistance of the first (for a motor: rated rise / rated loss)",
            "thermal resistance",
            ("K/W", "mK/W"),
            1e-6,
            1e6,
            "no body that heats lies outside this",
            Demo("0.04 K/W", "heat run of the braking resistor", "-10 %", "10 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "tau_one",
            "its time constant",
            "time",
            ("s", "min", "h"),
            1e-3,
            1e6,
            "a body that takes no time, or weeks, is not meant",
            Demo("180 s", "heat run of the braking resistor", "-15 %", "15 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "R_two",
            "thermal resistance of the second, highest",
            "thermal resistance",
            ("K/W", "mK/W"),
            1e-6,
            1e6,
            "no body that heats lies outside this",
            Demo("12 mK/W", "heat run of the braking resistor"),
            needed=TWO,
        ),
        Input(
            "tau_two",
            "its time constant",
            "time",
            ("min", "s", "h"),
            1e-3,
            1e6,
            "a body that takes no time, or weeks, is not meant",
            Demo("25 min", "heat run of the braking resistor", "-15 %", "15 %"),
            Tolerance.PERCENT,
            needed=TWO,
        ),
        Input(
            "T_amb",
            "ambient temperature",
            "temperature",
            ("degC",),
            -60.0,
            200.0,
            "no cabinet or hall is colder or hotter",
            Demo("25 degC", "site data of the quay", "-20 degC", "45 degC"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "T_lim",
            "temperature allowed",
            "temperature",
            ("degC",),
            -40.0,
            1500.0,
            "no insulation or resistor is rated outside this",
            Demo("350 degC", "resistor data sheet, surface in service"),
        ),
        Input(
            "dT_ok",
            "distance from the settled highest that counts as settled",
            "temperature difference",
            ("K",),
            0.01,
            100.0,
            "less cannot be measured, more is not settled",
            Demo("2 K", "common practice in heat runs"),
        ),
    ),
)

_PERIOD = "(t_on+t_off)"
_DUTY = "t_on/(t_on+t_off)"


def _ripple(resistance: str, tau: str, what: str) -> str:
    return f'{resistance}*FO_RIPPLE({tau},P_off,P_on,{_PERIOD},{_DUTY},"{what}")'


def _settled(what: str) -> str:
    """The settled rise of both bodies, written in inputs."""
    second = _ripple("R_two", "tau_two", what)
    return f"{_ripple('R_one', 'tau_one', what)}+IF({TWO},{second},0)"


def _by_hand(resistance: str, tau: str, what: str) -> str:
    on, off, whole = (f"EXP(-{t}/{tau})" for t in ("t_on", "t_off", _PERIOD))
    high, low = ("P_on", on, "P_off", off), ("P_off", off, "P_on", on)
    own, fall, other, other_fall = high if what == "max" else low
    return f"{resistance}*({own}*(1-{fall})+{other}*{fall}*(1-{other_fall}))/(1-{whole})"


def _settled_by_hand(what: str) -> str:
    one, two = _by_hand("R_one", "tau_one", what), _by_hand("R_two", "tau_two", what)
    return f"{one}+IF({TWO},{two},0)"


def _after(cycle: int) -> Quantity:
    at = f"{cycle - 1}*{_PERIOD}+t_on" if cycle > 1 else "t_on"

    def rise(resistance: str, tau: str) -> str:
        return f"{resistance}*FO_SQUARE({at},{tau},0,P_off,P_on,{_PERIOD},{_DUTY})"

    def by_hand(resistance: str, tau: str) -> str:
        # a lowest value of the settled cycle less what is left of it, then one more on-time
        settled = f"({_by_hand(resistance, tau, 'min')})"
        left = f"(1-EXP(-{cycle - 1}*{_PERIOD}/{tau}))"
        on = f"EXP(-t_on/{tau})"
        return f"{resistance}*P_on*(1-{on})+{settled}*{left}*{on}"

    return Quantity(
        f"T_end_{cycle}",
        f"at the end of on-time {cycle}",
        f"T_amb+{rise('R_one', 'tau_one')}+IF({TWO},{rise('R_two', 'tau_two')},0)",
        "temperature",
        f"T_amb + rise after {cycle - 1} whole cycles and one on-time, from ambient",
        f"T_amb+{by_hand('R_one', 'tau_one')}+IF({TWO},{by_hand('R_two', 'tau_two')},0)",
    )


SETTLED = Block(
    "Settled cycle, nominal",
    (
        Quantity(
            "P_mean",
            "mean power",
            f"(P_on*t_on+P_off*t_off)/{_PERIOD}",
            "power",
            "P_mean = (P_on t_on + P_off t_off) / (t_on + t_off)",
        ),
        Quantity(
            "T_mean",
            "settled mean temperature",
            f"T_amb+P_mean*(R_one+IF({TWO},R_two,0))",
            "temperature",
            "T_mean = T_amb + P_mean (R_one + R_two)",
        ),
        Quantity(
            "T_max",
            "settled highest temperature, at the end of each on-time",
            f"T_amb+{_settled('max')}",
            "temperature",
            "T_max = T_amb + sum of R (P_on (1 - a) + P_off a (1 - b)) / (1 - a b), "
            "a = exp(-t_on / tau), b = exp(-t_off / tau)",
            f"T_amb+{_settled_by_hand('max')}",
        ),
        Quantity(
            "T_min",
            "settled lowest temperature, at the end of each off-time",
            f"T_amb+{_settled('min')}",
            "temperature",
            "T_min = T_amb + sum of R (P_off (1 - b) + P_on b (1 - a)) / (1 - a b)",
            f"T_amb+{_settled_by_hand('min')}",
        ),
    ),
)

CYCLES = Block(
    "From cold, nominal: cycle by cycle",
    tuple(_after(cycle) for cycle in (1, 2, 3, 5, 10, 20, 50)),
)

SETTLING = Block(
    "How long it takes to settle, worst case",
    (
        Quantity(
            "tau_slow",
            "slowest time constant",
            f"MAX(tau_one_hi,IF({TWO},tau_two_hi,0))",
            "time",
            "tau_slow: the longer of the two, each at its longest",
        ),
        Quantity(
            "T_one",
            "first on-time, at its hottest",
            f"T_amb_hi+R_one_hi*FO_STEP(t_on_hi,tau_one_lo,0,P_on_hi)"
            f"+IF({TWO},R_two*FO_STEP(t_on_hi,tau_two_lo,0,P_on_hi),0)",
            "temperature",
            "T_one = T_amb,hi + sum of R P_on,hi (1 - exp(-t_on,hi / tau))",
            "T_amb_hi+R_one_hi*P_on_hi*(1-EXP(-t_on_hi/tau_one_lo))"
            f"+IF({TWO},R_two*P_on_hi*(1-EXP(-t_on_hi/tau_two_lo)),0)",
        ),
        Quantity(
            "T_avg",
            "settled mean, at its highest",
            "T_amb_hi+(P_on_hi*t_on_hi+P_off*t_off_lo)/(t_on_hi+t_off_lo)"
            f"*(R_one_hi+IF({TWO},R_two,0))",
            "temperature",
            "T_mean with everything that heats at its highest",
        ),
        Quantity(
            "t_settle",
            "time after the first on-time until each ends within dT_ok of the settled highest",
            "FO_TIME_UNTIL_BELOW(dT_ok,tau_slow,T_avg-T_amb_hi,0)",
            "time",
            "t_settle = tau_slow ln((T_avg - T_amb,hi) / dT_ok): the first on-time ends below the "
            "settled highest by less than the mean rise; all of it taken as the slowest body's",
            f"MAX(0,MAX(tau_one_hi,IF({TWO},tau_two_hi,0))*LN((P_on_hi*t_on_hi+P_off*t_off_lo)"
            f"/(t_on_hi+t_off_lo)*(R_one_hi+IF({TWO},R_two,0))/dT_ok))",
        ),
        Quantity(
            "n_settle",
            "cycles to settle",
            "1-INT(-ROUND(t_settle/(t_on_lo+t_off_lo),9))",
            COUNT,
            "n_settle = 1 + t_settle / (t_on + t_off), rounded up, with the shortest cycle",
        ),
    ),
)

CHECKS = (
    Check(
        "temperature",
        "Highest temperature, settled",
        "T_max_max",
        "T_lim",
        "temperature",
        "Rating of the resistor or of the insulation, at the highest ambient",
    ),
)

HAZARDS = (
    Hazard(
        "First cycles above the mean",
        "T_one>T_avg",
        "The first on-time alone may reach {T_one}, above the settled mean of {T_avg}: a choice by "
        "mean power would miss it.",
    ),
    Hazard(
        "Peaks far above the mean",
        "T_max_max-T_amb_hi>1.2*(T_avg-T_amb_hi)",
        "The settled highest, {T_max_max}, has a rise more than a fifth above that of the mean, "
        "{T_avg}.",
    ),
    Hazard(
        "Ambient without a highest",
        "T_amb_hi<=T_amb",
        "No ambient above {T_amb} is entered: the check is good for that ambient only.",
    ),
    Hazard(
        "One body only",
        f"AND(NOT({TWO}),t_on<tau_one/10)",
        "A short on-time heats the element or the winding faster than the whole body: one time "
        "constant hides that. Use two bodies where the heat run shows them.",
    ),
    Hazard(
        "Hot surface",
        "T_max_max>60",
        "The surface may reach {T_max_max}: guard it, and keep cables, dust and hands away.",
    ),
)


def _peaks(resistance: str, tau: str, p_on: str, t_on: str, t_off: str) -> str:
    """The smooth line through the ends of the on-times, with the first on-time before it."""
    ripple = f'FO_RIPPLE({tau},P_off,{p_on},{t_on}+{t_off},{t_on}/({t_on}+{t_off}),"max")'
    first = f"FO_STEP(MIN(t,{t_on}),{tau},0,{p_on})"
    return f"{resistance}*FO_STEP(t-{t_on},{tau},{first},{ripple})"


def _valleys(resistance: str, tau: str) -> str:
    """The smooth line through the ends of the off-times."""
    ripple = f'FO_RIPPLE({tau},P_off,P_on_hi,t_on_hi+t_off_lo,t_on_hi/(t_on_hi+t_off_lo),"min")'
    return f"{resistance}*FO_STEP(t,{tau},0,{ripple})"


def _both(one: str, two: str, ambient: str) -> str:
    return f"{ambient}+{one}+IF({TWO},{two},0)"


_HOT = ("P_on_hi", "t_on_hi", "t_off_lo")

CURVE = Curve(
    end="MAX(t_settle,6*(t_on+t_off))",
    time_unit="min",
    quantity="temperature",
    unit="degC",
    y_title="temperature",
    caption="From cold, the first on-time begins at 0; at ambient before. Lines through the ends "
    "of the on-times and of the off-times: in each cycle the temperature goes from one to the "
    "other and back. Worst case: power, on-time, R_one and ambient highest, off-time and both "
    "time constants lowest.",
    traces=(
        Trace(
            "ends of on-times, worst case",
            _both(
                _peaks("R_one_hi", "tau_one_lo", *_HOT),
                _peaks("R_two", "tau_two_lo", *_HOT),
                "T_amb_hi",
            ),
        ),
        Trace(
            "ends of off-times, worst case",
            _both(_valleys("R_one_hi", "tau_one_lo"), _valleys("R_two", "tau_two_lo"), "T_amb_hi"),
        ),
        Trace(
            "ends of on-times, nominal",
            _both(
                _peaks("R_one", "tau_one", "P_on", "t_on", "t_off"),
                _peaks("R_two", "tau_two", "P_on", "t_on", "t_off"),
                "T_amb",
            ),
        ),
    ),
    levels=(Level("allowed", "T_lim"),),
    marks=(Mark("settled within dT_ok", "t_settle", "T_max_max"),),
    points=90,
    from_zero=False,
)

CAUTIONS = (
    Caution(
        "Hot for long",
        "A braking resistor or a motor stays hot long after the work has stopped. Measure before "
        "touching; a calculated time of cooling is no proof.",
    ),
    Caution(
        "Fire",
        "Dust, grease and packing burn at such temperatures. Keep the clearances of the maker, and "
        "keep the vents free.",
    ),
    Caution(
        "Voltage on the element",
        "The element of a braking resistor carries the voltage of the d.c. link, also while the "
        "drive stands still. Isolate and prove dead first.",
    ),
    Caution(
        "Ventilation that fails",
        "With a blocked fan or filter the thermal resistance rises several times. A thermal switch "
        "must stop the drive then; this page assumes the ventilation of the heat run.",
    ),
)

BASIS = Basis(
    method=(
        "Each body: tau dT/dt + T = R_th P(t), a square of power from cold. Settled extremes and "
        "every cycle's end in closed form; the rises of two bodies add up.",
        "Worst case over every corner of power, times, R_one, both time constants and ambient; "
        "R_two is entered at its highest. Settling is reckoned with the longest time constants.",
    ),
    assumptions=(
        "Thermal resistance and time constant do not change with temperature, and are those of the "
        "ventilation in service: a fan that stops in the off-time makes cooling slower than "
        "reckoned.",
        "Cycles repeat without end; power is constant within the on-time and the off-time.",
        "A motor: losses at the load of the cycle, and the time constant at its cooling.",
    ),
    sources=(
        "Sum of first-order bodies fitted to a heat run: common practice.",
        "Duty types S3 and after: IEC 60034-1, from memory; confirm against the edition in force.",
    ),
    not_covered=(
        "Adiabatic peaks within an on-time shorter than the element's own time constant, radiation "
        "that makes cooling faster when hot, resistance that changes with temperature, ageing of "
        "insulation.",
    ),
)

SHEET = Sheet(
    name="heating",
    title="Heating in intermittent duty",
    question="how hot does a braking resistor or a motor get in intermittent duty?",
    purpose="To show that the temperature stays within what is allowed when the same duty is "
    "repeated without end, at the highest ambient.",
    picture=Picture(
        "heating.png",
        "The power is P_on for t_on, then P_off for t_off, again and again from t = 0. The second "
        "body is there only where two bodies are chosen.",
    ),
    groups=(DUTY, BODY),
    blocks=(SETTLED, CYCLES, SETTLING),
    worst_cases=(
        WorstCase(
            "T_max",
            f"T_amb+{_settled('max')}",
            tuple(
                Varies(part)
                for part in ("P_on", "t_on", "t_off", "R_one", "tau_one", "tau_two", "T_amb")
            ),
            draws=60,
        ),
    ),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-012",
        "Hoist drive: braking resistor",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
)
"""The calc sheet."""
