"""Does an R-C filter pass the signal, stop the noise and ride over contact bounce?

A contact (or an output) with one source resistance when closed and another when open: the
capacitor charges and discharges through different paths. Bounces are a table of times; the
capacitor keeps what each of them leaves, so they add up.
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
    EntryTable,
    Formed,
    Group,
    Hazard,
    Heading,
    Input,
    Level,
    Mark,
    Moment,
    NumberColumn,
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

SOURCE = Group(
    "Source",
    (
        Input(
            "V_on",
            "source voltage, contact closed",
            "voltage",
            ("V", "mV", "kV"),
            1e-3,
            1e4,
            "no signal source of such a filter lies outside this",
            Demo("24 V", "control supply data sheet", "20.4 V", "28.8 V"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "R_on",
            "source resistance, contact closed",
            "resistance",
            ("ohm", "kohm", "Mohm", "mohm"),
            0.0,
            1e9,
            "contact, cable and output stage lie between these",
            Demo("100 ohm", "cable list, 400 m; contact data sheet"),
        ),
        Input(
            "V_idle",
            "source voltage, contact open",
            "voltage",
            ("V", "mV"),
            0.0,
            1e4,
            "it leads here when the contact is open: 0 for a resistor to the negative pole",
            Demo("0 V", "schematic, resistor to 0 V"),
        ),
        Input(
            "R_off",
            "source resistance, contact open (1 Gohm where nothing is left)",
            "resistance",
            ("kohm", "ohm", "Mohm", "Gohm"),
            1e-3,
            1e9,
            "a resistor to the pole, or an output stage, lies between these",
            Demo("4.7 kohm", "resistor data sheet", "-5 %", "5 %"),
            Tolerance.PERCENT,
        ),
    ),
)

FILTER = Group(
    "Filter and input",
    (
        Input(
            "R_flt",
            "resistance of the filter",
            "resistance",
            ("kohm", "ohm", "Mohm"),
            1e-3,
            1e9,
            "no filter resistor lies outside this",
            Demo("22 kohm", "resistor data sheet", "-2 %", "2 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "C_flt",
            "capacitance of the filter",
            "capacitance",
            ("nF", "uF", "pF", "mF"),
            1e-13,
            1.0,
            "no filter capacitor lies outside this",
            Demo("470 nF", "capacitor data sheet, film, with temperature", "-12 %", "12 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "R_load",
            "resistance of the input (1 Gohm where there is none)",
            "resistance",
            ("kohm", "ohm", "Mohm", "Gohm"),
            1e-3,
            1e9,
            "no input lies outside this",
            Demo("100 kohm", "divider at the input, data sheet", "-2 %", "2 %"),
            Tolerance.PERCENT,
        ),
        Input(
            "I_in",
            "highest current into or out of the input",
            "current",
            ("uA", "nA", "mA", "pA"),
            0.0,
            1.0,
            "enter its size; it is taken against the signal, either way",
            Demo("1 uA", "input data sheet"),
        ),
        Input(
            "V_up",
            "threshold of the input for a rising voltage",
            "voltage",
            ("V", "mV", "kV"),
            1e-6,
            1e4,
            "no input switches outside this",
            Demo("13 V", "input data sheet", "12 V", "14 V"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "V_dn",
            "threshold of the input for a falling voltage",
            "voltage",
            ("V", "mV", "kV"),
            1e-6,
            1e4,
            "no input switches outside this",
            Demo("8.5 V", "input data sheet", "7.5 V", "9.5 V"),
            Tolerance.ABSOLUTE,
            (
                Rule(
                    "AND(V_dn<=V_up,V_dn_lo<=V_up_lo,V_dn_hi<=V_up_hi)",
                    "is above V_up: an input falls back at or below where it switched",
                ),
            ),
        ),
    ),
)

ASKED = Group(
    "What is asked for",
    (
        Input(
            "f_sig",
            "highest frequency of the signal",
            "frequency",
            ("Hz", "kHz", "mHz", "MHz"),
            1e-6,
            1e9,
            "no signal of such a filter lies outside this",
            Demo("5 Hz", "limit switches of trolley and hoist, at full speed"),
        ),
        Input(
            "a_pass",
            "attenuation of the signal allowed, in dB",
            NUMBER,
            (),
            1e-6,
            60.0,
            "more than 60 dB is no signal any more",
            Demo("1", "requirements of the crane control"),
        ),
        Input(
            "f_noise",
            "lowest frequency of the noise",
            "frequency",
            ("kHz", "Hz", "MHz", "mHz"),
            1e-6,
            1e10,
            "no noise that a filter is made for lies outside this",
            Demo("2 kHz", "drive data sheet, switching frequency"),
            rules=(
                Rule("f_noise>f_sig", "is not above the signal's: no low-pass keeps them apart"),
            ),
        ),
        Input(
            "a_stop",
            "attenuation of the noise asked for, in dB",
            NUMBER,
            (),
            1e-6,
            200.0,
            "no single R-C filter stops more than this",
            Demo("30", "requirements of the crane control"),
        ),
        Input(
            "t_most",
            "longest time from the first touch until the input has surely switched",
            "time",
            ("ms", "us", "s", "ns"),
            1e-9,
            1e5,
            "a filter that is asked for is faster than a day",
            Demo("40 ms", "stopping distance of the trolley at full speed"),
        ),
        Choice(
            "bouncing",
            "the contact bounces when it",
            ("closes and opens", "closes only"),
            Demo("closes and opens", "limit switch, record of both"),
        ),
    ),
)

ROWS = 8

BOUNCE = EntryTable(
    "bounce",
    "Contact bounce before it rests",
    (
        NumberColumn(
            "new",
            "in the new state for",
            "time",
            ("ms", "us", "ns", "s"),
            1e-12,
            1e3,
            "a bounce lasts longer than nothing",
            span=2,
        ),
        NumberColumn(
            "old",
            "back in the old state for",
            "time",
            ("ms", "us", "ns", "s"),
            1e-12,
            1e3,
            "a bounce lasts longer than nothing",
            span=2,
        ),
    ),
    ROWS,
    (
        ("0.8 ms", "0.6 ms"),
        ("1.2 ms", "0.4 ms"),
        ("0.5 ms", "0.9 ms"),
        ("0.3 ms", "0.2 ms"),
    ),
    "oscilloscope, limit switch of the trolley, worst of 50",
    row="bounce",
)

_LO_HI = {"_lo": "_hi", "_hi": "_lo", "": ""}


def _tau(end: str, state: str) -> str:
    """Time constant of a path: "on" or "off", with every part at an end."""
    source = "R_on" if state == "on" else f"R_off{end}"
    return f"C_flt{end}/(1/({source}+R_flt{end})+1/R_load{end})"


def _share(end: str, state: str) -> str:
    """Share of the source that reaches the capacitor."""
    other = _LO_HI[end]
    source = "R_on" if state == "on" else f"R_off{other}"
    return f"R_load{end}/(R_load{end}+{source}+R_flt{other})"


LEVELS = Block(
    "Levels of the capacitor at rest, worst case",
    (
        Quantity(
            "V_top",
            "contact closed, highest",
            f"(V_on_hi+I_in*(R_on+R_flt_hi))*{_share('_hi', 'on')}",
            "voltage",
            "(V_on,hi + I_in (R_on + R_flt,hi)) R_load / (R_load + R_on + R_flt), the share at its "
            "highest",
        ),
        Quantity(
            "V_high",
            "contact closed, lowest",
            f"(V_on_lo-I_in*(R_on+R_flt_hi))*{_share('_lo', 'on')}",
            "voltage",
            "(V_on,lo - I_in (R_on + R_flt,hi)) R_load / (R_load + R_on + R_flt), the share at its "
            "lowest",
            "(V_on_lo/(R_on+R_flt_hi)-I_in)/(1/(R_on+R_flt_hi)+1/R_load_lo)",
        ),
        Quantity(
            "V_low",
            "contact open, highest",
            f"(V_idle+I_in*(R_off_hi+R_flt_hi))*{_share('_hi', 'off')}",
            "voltage",
            "(V_idle + I_in (R_off,hi + R_flt,hi)) R_load / (R_load + R_off + R_flt), the share at "
            "its highest",
            "(V_idle+I_in*(R_off_hi+R_flt_hi))/(1+(R_off_lo+R_flt_lo)/R_load_hi)",
        ),
        Quantity(
            "V_least",
            "contact open, lowest",
            "V_idle-I_in*(R_off_hi+R_flt_hi)",
            "voltage",
            "V_idle - I_in (R_off,hi + R_flt,hi), whatever R_load",
        ),
    ),
)

PATHS = Block(
    "Time constants of both paths",
    (
        Quantity(
            "tau_on",
            "contact closed, nominal",
            f"FO_TAU_RC({_tau('', 'on').replace('C_flt', '1')},C_flt)",
            "time",
            "C_flt times R_on + R_flt beside R_load",
        ),
        Quantity(
            "tau_off",
            "contact open, nominal",
            f"FO_TAU_RC({_tau('', 'off').replace('C_flt', '1')},C_flt)",
            "time",
            "C_flt times R_off + R_flt beside R_load",
        ),
        Quantity(
            "on_fast",
            "contact closed, shortest",
            _tau("_lo", "on"),
            "time",
            "tau_on with every part at its lowest",
        ),
        Quantity(
            "on_slow",
            "contact closed, longest",
            _tau("_hi", "on"),
            "time",
            "tau_on with every part at its highest",
        ),
        Quantity(
            "off_fast",
            "contact open, shortest",
            _tau("_lo", "off"),
            "time",
            "tau_off with every part at its lowest",
        ),
        Quantity(
            "off_slow",
            "contact open, longest",
            _tau("_hi", "off"),
            "time",
            "tau_off with every part at its highest",
        ),
        Quantity(
            "k_path",
            "longer time constant over the shorter, nominal",
            "MAX(tau_on,tau_off)/MIN(tau_on,tau_off)",
            NUMBER,
            "1 where charge and discharge take the same path",
        ),
    ),
)


def _decibels(frequency: str, tau: str) -> str:
    """10 log10(1 + x), x = (2 pi f tau)^2; by its series where x is small."""
    x = f"(2*PI()*{frequency}*{tau})^2"
    return f"IF({x}<1E-4,10/LN(10)*{x}*(1-{x}/2+{x}^2/3-{x}^3/4),10*LOG10(1+{x}))"


FREQUENCY = Block(
    "Signal and noise",
    (
        Quantity(
            "f_c",
            "corner frequency, contact closed, nominal",
            "FO_CORNER_FREQUENCY(tau_on)",
            "frequency",
            "f_c = 1 / (2 pi tau_on)",
            f"1/(2*PI()*{_tau('', 'on')})",
        ),
        Quantity(
            "f_low",
            "corner frequency, lowest",
            "FO_CORNER_FREQUENCY(MAX(on_slow,off_slow))",
            "frequency",
            "of the longest time constant, which passes the signal least",
            "1/(2*PI()*MAX(on_slow,off_slow))",
        ),
        Quantity(
            "f_high",
            "corner frequency, highest",
            "FO_CORNER_FREQUENCY(MIN(on_fast,off_fast))",
            "frequency",
            "of the shortest time constant, which stops the noise least",
            "1/(2*PI()*MIN(on_fast,off_fast))",
        ),
        Quantity(
            "a_sig",
            "attenuation of the signal, highest, in dB",
            "-FO_GAIN_DB(f_sig,MAX(on_slow,off_slow))",
            NUMBER,
            "10 log10(1 + (f_sig / f_low)^2), against d.c.",
            _decibels("f_sig", "MAX(on_slow,off_slow)"),
        ),
        Quantity(
            "a_noise",
            "attenuation of the noise, lowest, in dB",
            "-FO_GAIN_DB(f_noise,MIN(on_fast,off_fast))",
            NUMBER,
            "10 log10(1 + (f_noise / f_high)^2), against d.c.",
            _decibels("f_noise", "MIN(on_fast,off_fast)"),
        ),
    ),
)

_START_LOW = "(V_idle-I_in*(R_off_hi+R_flt))"
_END_HIGH = "(V_on-I_in*(R_on+R_flt))*R_load/(R_load+R_on+R_flt)"
_START_HIGH = "(V_on+I_in*(R_on+R_flt))*R_load/(R_load+R_on+R_flt)"
_END_LOW = "(V_idle+I_in*(R_off+R_flt))*R_load/(R_load+R_off+R_flt)"

SWITCHING = Block(
    "Switching after a clean change",
    (
        Quantity(
            "t_close",
            "from closing to V_up, nominal",
            f"FO_TIME_TO(V_up,tau_on,{_START_LOW},{_END_HIGH})",
            "time",
            "tau_on ln((end - start) / (end - V_up)), start and end as V_least and V_high, the "
            "input current against the signal",
            f"IF({_START_LOW}<=V_up,{_tau('', 'on')}*(LN({_END_HIGH}-{_START_LOW})"
            f"-LN({_END_HIGH}-V_up)),NA())",
        ),
        Quantity(
            "t_open",
            "from opening to V_dn, nominal",
            f"FO_TIME_TO(V_dn,tau_off,{_START_HIGH},{_END_LOW})",
            "time",
            "tau_off ln((start - end) / (V_dn - end)), start and end as V_top and V_low, the input "
            "current against the signal",
            f"IF({_START_HIGH}>=V_dn,{_tau('', 'off')}*(LN({_START_HIGH}-{_END_LOW})"
            f"-LN(V_dn-{_END_LOW})),NA())",
        ),
        Quantity(
            "t_bounce",
            "time from the first touch until the contact rests",
            "IF(bounce_count>0,SUM(bounce_new)+SUM(bounce_old),NA())",
            "time",
            "the sum of the table in part 4",
        ),
        Quantity(
            "t_sure",
            "from the first touch until the input has surely switched, longest",
            'MAX(t_bounce+t_close_max,IF(bouncing="closes only",0,t_bounce)+t_open_max)',
            "time",
            "t_bounce and the longest of t_close and t_open in part 6, as if the bounces had left "
            "nothing",
        ),
    ),
)

RIDE = Block(
    "Level that the bounces reach, worst case",
    (
        Quantity(
            "t_peak",
            "when the level is highest while the contact closes",
            "INDEX(run_peak_at,MATCH(MAX(run_peak),run_peak,0))",
            "time",
            "end of the bounce in the new state that reaches farthest",
        ),
        Quantity(
            "V_peak",
            "highest level before the contact rests closed",
            "FO_STAGES(t_peak,V_low,closing)",
            "voltage",
            "charged towards V_top with on_fast, discharged towards V_low with off_slow, bounce by "
            "bounce",
            "MAX(run_peak)",
        ),
        Quantity(
            "V_one",
            "what the longest bounce alone would reach",
            "V_low+(V_top-V_low)*(1-EXP(-MAX(run_new)/on_fast))",
            "voltage",
            "V_low + (V_top - V_low) (1 - exp(-longest / on_fast))",
        ),
        Quantity(
            "t_dip",
            "when the level is lowest while the contact opens",
            "INDEX(run_peak_at,MATCH(MIN(run_dip),run_dip,0))",
            "time",
            "end of the bounce in the new state that reaches farthest",
        ),
        Quantity(
            "V_dip",
            "lowest level before the contact rests open",
            'IF(bouncing="closes only",V_high,FO_STAGES(t_dip,V_high,opening))',
            "voltage",
            "discharged towards V_least with off_fast, charged towards V_high with on_slow; V_high "
            "where it bounces when it closes only",
            'IF(bouncing="closes only",V_high_hand,MIN(run_dip))',
        ),
        Quantity(
            "t_late",
            "slowest switching with these bounces",
            'FO_STAGES_CROSSING(V_up_hi,V_least,late,"rising")',
            "time",
            "first crossing of the highest V_up, slowest charge, fastest discharge; for the curve",
        ),
    ),
)


def _stages(name: str, new: tuple[str, str], old: tuple[str, str]) -> Formed:
    """Stages of the bounces: time constant and level of the new state and of the old one."""
    rows = []
    for number in range(1, ROWS + 1):
        here = f"IF({number}<=bounce_count,INDEX(run_at,{number})"
        half = f"IF({number}<=bounce_count,INDEX(run_peak_at,{number})"
        rows += [
            (f'{here},"")', *(f'IF({number}<=bounce_count,{what},"")' for what in new)),
            (f'{half},"")', *(f'IF({number}<=bounce_count,{what},"")' for what in old)),
        ]
    rows.append(("t_bounce", *new))
    return Formed(name, ("start", "tau", "heads"), tuple(rows))


def _run() -> Formed:
    """Bounce by bounce with built-in functions: when, and the levels reached.

    Rows beyond the last bounce have a length of 0 and repeat the level of rest.
    """
    columns = ("new", "old", "at", "peak_at", "peak", "rest", "dip", "back")
    rows = []
    for number in range(1, ROWS + 1):
        first = number == 1
        new, old = (
            f"IF({number}<=bounce_count,INDEX(bounce_{which},{number}),0)"
            for which in ("new", "old")
        )
        before, above, below = (
            ("0", "V_low_hand", "V_high_hand")
            if first
            else ("above_at+above_new+above_old", "above_rest", "above_back")
        )
        rows.append(
            (
                new,
                old,
                before,
                "here_at+here_new",
                f"V_top+({above}-V_top)*EXP(-here_new/on_fast)",
                "V_low_hand+(here_peak-V_low_hand)*EXP(-here_old/off_slow)",
                f"V_least+({below}-V_least)*EXP(-here_new/off_fast)",
                "V_high_hand+(here_dip-V_high_hand)*EXP(-here_old/on_slow)",
            )
        )
    return Formed("run", columns, tuple(rows))


WORST_CLOSE = WorstCase(
    "t_close",
    f"FO_TIME_TO(V_up,{_tau('', 'on')},{_START_LOW},{_END_HIGH})",
    (Varies("R_flt"), Varies("C_flt"), Varies("R_load"), Varies("V_on"), Varies("V_up")),
    draws=80,
)

WORST_OPEN = WorstCase(
    "t_open",
    f"FO_TIME_TO(V_dn,{_tau('', 'off')},{_START_HIGH},{_END_LOW})",
    (
        Varies("R_flt"),
        Varies("C_flt"),
        Varies("R_load"),
        Varies("V_on"),
        Varies("V_dn"),
        Varies("R_off"),
    ),
    draws=80,
)

CHECKS = (
    Check(
        "signal",
        "Attenuation of the signal, dB",
        "a_sig",
        "a_pass",
        NUMBER,
        "At the highest frequency of the signal, against d.c., slower of both paths",
    ),
    Check(
        "noise",
        "Attenuation of the noise, dB",
        "a_noise",
        "a_stop",
        NUMBER,
        "At the lowest frequency of the noise, against d.c., faster of both paths",
        Sense.AT_LEAST,
    ),
    Check(
        "closed",
        "Level with the contact closed",
        "V_high",
        "V_up_hi",
        "voltage",
        "It must lie above the highest V_up, or the input never switches",
        Sense.AT_LEAST,
    ),
    Check(
        "open",
        "Level with the contact open",
        "V_low",
        "V_dn_lo",
        "voltage",
        "It must lie below the lowest V_dn, or the input never falls back",
    ),
    Check(
        "time",
        "Time until it has surely switched",
        "t_sure",
        "t_most",
        "time",
        "Longest time allowed, bounces included, both ways",
    ),
    Check(
        "bounce_closing",
        "Level reached while it closes",
        "V_peak",
        "V_up_lo",
        "voltage",
        "Below the lowest V_up the input switches once, after the contact rests",
    ),
    Check(
        "bounce_opening",
        "Level reached while it opens",
        "V_dip",
        "V_dn_hi",
        "voltage",
        "Above the highest V_dn the input switches once, after the contact rests",
        Sense.AT_LEAST,
    ),
)

HAZARDS = (
    Hazard(
        "Unequal charge and discharge",
        "k_path>1.5",
        "The capacitor charges with {tau_on} and discharges with {tau_off}: one corner frequency "
        "does not describe it. Each way is checked with its own path.",
    ),
    Hazard(
        "Bounces that add up",
        "V_peak>V_one+0.1*(V_up_lo-V_low)",
        "The longest bounce alone reaches {V_one}, all of them together {V_peak}: judged one by "
        "one they would seem harmless.",
    ),
    Hazard(
        "Little hysteresis",
        "V_up_lo-V_dn_hi<0.02*(V_up_lo-V_low)",
        "V_up and V_dn may lie so close that noise on the slow edge makes the input switch many "
        "times.",
    ),
    Hazard(
        "Bounces take much of the time",
        "t_bounce>0.5*t_most",
        "The bounces take {t_bounce}, more than half of the time allowed: the contact may wear "
        "beyond it.",
    ),
)

CURVE = Curve(
    end="MAX(1.1*t_most,t_bounce+3*on_slow)",
    time_unit="ms",
    quantity="voltage",
    unit="V",
    y_title="voltage of the capacitor",
    caption="First touch at 0, while the contact closes. Fastest: charged with on_fast, "
    "discharged with off_slow, all levels highest. Slowest: the other way round.",
    traces=(
        Trace("fastest", "FO_STAGES(t,V_low,closing)"),
        Trace("slowest", "FO_STAGES(t,V_least,late)"),
    ),
    levels=(Level("V_up, highest", "V_up_hi"), Level("V_up, lowest", "V_up_lo")),
    moments=(Moment("contact rests", "t_bounce"), Moment("time allowed", "t_most")),
    marks=(
        Mark("highest in the bounces", "t_peak", "V_peak"),
        Mark("switches, slowest", "t_late", "V_up_hi"),
    ),
)

CAUTIONS = (
    Caution(
        "A filter delays every stop",
        "The time of this sheet is travel of the machine: add it to the stopping distance. Limit "
        "and emergency stop circuits follow their own rules and stay unfiltered where those ask "
        "for it.",
    ),
    Caution(
        "Contacts wear",
        "Bounce grows with wear, vibration and dirt. Measure used contacts and in both "
        "directions, enter the worst, and measure again at intervals.",
    ),
    Caution(
        "Inrush through the contact",
        "Without R_flt before it, the capacitor is a short at each closing and welds small "
        "contacts. Some contacts need a least current to stay clean: the filter must not take "
        "it away.",
    ),
    Caution(
        "Surge and touch",
        "An R-C filter is no protection against surges, nor is it insulation. Rate its parts for "
        "the voltages of the line, and isolate before touching a crane's control wiring.",
    ),
)

BASIS = Basis(
    method=(
        "One resistance and one capacitance for each state of the contact, the load and the input "
        "current turned into their equivalent (Thevenin). Natural response from bounce to bounce.",
        "Attenuation of a sine against d.c. with the slower path for the signal and the faster one "
        "for the noise.",
        "Bounces: fastest charge with slowest discharge, levels at their farthest, as if each "
        "could be so by itself. That is an upper bound, on the safe side.",
        "The times take the worst corner of the tolerances, the input current against the signal, "
        "and nothing left from the bounces.",
    ),
    assumptions=(
        "Contact at rest long before; each bounce is a full opening or closing.",
        "The pattern entered is the worst, the same for closing and opening unless it is said to "
        "bounce when it closes only. A pattern of other lengths may reach farther.",
        "Parts vary independently within their limits and do not change with voltage; R_on, "
        "V_idle and I_in are entered at their worst.",
    ),
    sources=(
        "Corner frequency 1 / (2 pi tau) and attenuation 10 log10(1 + (f / f_c)^2): closed form.",
        "Bounces of a few milliseconds in switches with snap action: common practice; the record "
        "of the contact decides.",
    ),
    not_covered=(
        "Noise that is coupled in behind the filter, inductance of cables and parts, surge and "
        "burst immunity, contact current and life, debouncing by software, and filters of higher "
        "order.",
    ),
)

SHEET = Sheet(
    name="filter",
    title="R-C filter at a contact or signal input",
    question="does an R-C filter pass the signal, stop the noise and ride over contact bounce?",
    purpose="To show that the filter passes the signal, stops the noise, and lets the input switch "
    "once and in time although the contact bounces.",
    picture=Picture(
        "filter.png",
        "The contact first closes, or opens, at t = 0, bounces as the table says, and then rests. "
        "Closed, the capacitor is fed from V_on; open, it is led to V_idle through R_off.",
    ),
    groups=(SOURCE, FILTER, ASKED),
    blocks=(LEVELS, PATHS, FREQUENCY, SWITCHING, RIDE),
    worst_cases=(WORST_CLOSE, WORST_OPEN),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-005",
        "Trolley limit switch: input filter",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
    formed=(
        _run(),
        _stages("closing", ("on_fast", "V_top"), ("off_slow", "V_low")),
        _stages("opening", ("off_fast", "V_least"), ("on_slow", "V_high")),
        _stages("late", ("on_slow", "V_high"), ("off_fast", "V_least")),
    ),
    filled_in=(BOUNCE,),
)
"""The calc sheet."""
