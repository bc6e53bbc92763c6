"""What happens to a capacitor or an inductor over several switching stages?

Each stage connects the store through a resistance to a source voltage, drives it with a constant
current, or holds it. The stage table states R, the source and the store's value of every stage, so
that each time constant can be traced. Bounds over the tolerances are carried from stage to stage:
within a stage the store's value rises with its start, with the level it heads for, and to one side
with the time constant, so the ends of each decide.
"""

from __future__ import annotations

from tausheet.templates import stage_rows
from tausheet.templates.model import (
    COUNT,
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
    ListColumn,
    Listing,
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
    WordColumn,
)
from tausheet.templates.stage_rows import (
    CAPACITOR,
    CHARGE,
    DIODE,
    DRIVEN,
    HELD,
    ROWS,
    THROUGH,
    VALUE,
)

UNIT = f'IF({CAPACITOR},"V","A")'

STORE = Group(
    "The store",
    (
        Choice(
            "store",
            "what stores the energy",
            ("capacitor", "inductor"),
            Demo("capacitor", "single-line diagram of the hoist drive"),
        ),
        Input(
            "C_store",
            "capacitance",
            "capacitance",
            ("mF", "uF", "nF", "F"),
            1e-12,
            1e3,
            "no capacitor that is switched lies outside this",
            Demo("4.7 mF", "d.c. link, capacitor data sheet", "-20 %", "20 %"),
            Tolerance.PERCENT,
            needed=CAPACITOR,
        ),
        Input(
            "L_store",
            "inductance",
            "inductance",
            ("H", "mH", "uH"),
            1e-9,
            1e4,
            "no inductor that is switched lies outside this",
            Demo("", ""),
            Tolerance.PERCENT,
            needed='store="inductor"',
        ),
        Input(
            "y_start",
            "value before the first switching: V of a capacitor, A of an inductor",
            NUMBER,
            (),
            -1e6,
            1e6,
            "no store of this kind is charged beyond it",
            Demo("0", "discharged overnight", "0", "20"),
            Tolerance.ABSOLUTE,
        ),
    ),
)

SPREAD = Group(
    "Spread of what the stage table states",
    (
        Input(
            "k_R",
            "resistance, as a share of that in the table",
            "ratio",
            ("%",),
            0.1,
            10.0,
            "a spread beyond a factor of ten is a slip",
            Demo("100 %", "resistor data sheets, with temperature", "95 %", "105 %"),
            Tolerance.ABSOLUTE,
        ),
        Input(
            "k_E",
            "source voltage or current, as a share of that in the table",
            "ratio",
            ("%",),
            0.1,
            10.0,
            "a spread beyond a factor of ten is a slip",
            Demo("100 %", "400 V mains, EN 50160 (from memory)", "90 %", "110 %"),
            Tolerance.ABSOLUTE,
        ),
    ),
)

QUESTION = Group(
    "What is asked",
    (
        Input(
            "t_end",
            "end of the last stage",
            "time",
            ("s", "ms", "us", "min", "h"),
            1e-9,
            1e7,
            "no sequence is shorter or longer",
            Demo("10 s", "control description of the drive"),
        ),
        Input(
            "y_level",
            "level whose crossing is looked for: V or A",
            NUMBER,
            (),
            -1e6,
            1e6,
            "no store of this kind is charged beyond it",
            Demo("60", "IEC 60204-1, 6.2.4 (from memory)"),
        ),
        Choice(
            "direction",
            "direction in which it is crossed",
            ("rising", "falling", "either"),
            Demo("falling", "control description of the drive"),
        ),
        Input(
            "t_ask",
            "moment at which the value must lie inside the limits below",
            "time",
            ("s", "ms", "us", "min", "h"),
            0.0,
            1e7,
            "no sequence is longer",
            Demo("9 s", "door interlock releases 5 s after switching off"),
            rules=(Rule("t_ask<=t_end", "lies after t_end, where nothing is calculated"),),
        ),
        Input(
            "y_upper",
            "highest value allowed at that moment: V or A",
            NUMBER,
            (),
            -1e6,
            1e6,
            "no store of this kind is charged beyond it",
            Demo("60", "IEC 60204-1, 6.2.4 (from memory)"),
        ),
        Input(
            "y_lower",
            "lowest value allowed at that moment: V or A",
            NUMBER,
            (),
            -1e6,
            1e6,
            "no store of this kind is charged beyond it",
            Demo("-1", "no reversal of the electrolytic capacitors"),
            rules=(Rule("y_lower<y_upper", "is not below y_upper: nothing can lie between"),),
        ),
        Input(
            "y_rated",
            "largest magnitude allowed at any time: V or A",
            NUMBER,
            (),
            1e-9,
            1e6,
            "no store of this kind is rated outside this",
            Demo("800", "capacitor data sheet, two in series"),
        ),
        Input(
            "W_rated",
            "heat allowed in one stage, of the weakest resistor",
            "energy",
            ("J", "kJ", "mJ", "MJ"),
            1e-9,
            1e10,
            "no resistor is rated outside this",
            Demo("1.5 kJ", "pulse rating of the pre-charge resistor"),
        ),
    ),
)

_SHARE = 'IF({0}_share="",1,{0}_share)'
_THROUGH = f'OR(here_mode="{THROUGH}",here_mode="{DIODE}")'

STAGE = EntryTable(
    "stage",
    "Stages",
    (
        NumberColumn(
            "start", "starts at", "time", ("s", "ms", "us", "min"), 0.0, 1e7, "nothing is before 0"
        ),
        WordColumn("mode", "what the store is joined to", (THROUGH, DIODE, DRIVEN, HELD)),
        NumberColumn(
            "R",
            "resistance in the path",
            "resistance",
            ("ohm", "mohm", "kohm", "Mohm"),
            1e-6,
            1e12,
            "a path has some resistance",
            needed=False,
        ),
        NumberColumn(
            "share",
            "store, % of its value",
            "ratio",
            ("%",),
            1e-3,
            1e3,
            "a store that changes by more is another store",
            needed=False,
        ),
        NumberColumn(
            "E",
            "source voltage",
            "voltage",
            ("V", "kV", "mV"),
            -1e6,
            1e6,
            "no source lies outside this",
            needed=False,
        ),
        NumberColumn(
            "I",
            "constant current",
            "current",
            ("A", "mA", "uA", "kA"),
            -1e6,
            1e6,
            "no source lies outside this",
            needed=False,
        ),
        WordColumn("kept", "kept when the store changes", (CHARGE, VALUE), needed=False),
    ),
    ROWS,
    (
        ("0 s", THROUGH, "47 ohm", "", "565 V", "", ""),
        ("1.5 s", THROUGH, "0.1 ohm", "", "565 V", "", ""),
        ("3 s", HELD, "", "", "", "", ""),
        ("4 s", THROUGH, "220 ohm", "", "0 V", "", ""),
    ),
    "control description of the drive, resistors from the parts list",
    rules=(
        Rule("IF(here_row=1,here_start=0,TRUE)", "the first stage must start at 0"),
        Rule("here_start>above_start", "must start later than the row above"),
        Rule("here_start<t_end", "starts after t_end: move t_end or the stage"),
        Rule(
            f"IF({_THROUGH},AND(ISNUMBER(here_R),ISNUMBER(here_E)),TRUE)",
            "needs the resistance and the source voltage (0 V where there is none): without R "
            "its time constant cannot be traced",
        ),
        Rule(
            f'IF(here_mode="{DRIVEN}",AND({CAPACITOR},ISNUMBER(here_I)),here_I="")',
            "a constant current goes with a capacitor, and with that word alone: give it there, "
            "and nowhere else",
        ),
        Rule(
            f'IF(here_mode="{DIODE}",NOT({CAPACITOR}),TRUE)',
            "the diode is meant for an inductor; a capacitor whose diode blocks is held",
        ),
        Rule(
            f'IF({_THROUGH},TRUE,here_E="")',
            "has a source voltage that the stage does not use: clear it",
        ),
        Rule(
            f'IF(here_mode="{HELD}",here_R="",TRUE)',
            "has a resistance, so the store is not held: clear it, or join it through R",
        ),
        Rule(
            f"IF(here_row=1,{_SHARE.format('here')}=1,TRUE)",
            "the first stage begins with the whole store: leave its share blank",
        ),
        Rule(
            f'IF(ABS({_SHARE.format("here")}-{_SHARE.format("above")})<1E-9,TRUE,here_kept<>"")',
            "the store changes here: say whether its charge (flux) or its voltage (current) is "
            "kept, for what happens differs",
        ),
        Rule(
            f'IF(ABS({_SHARE.format("here")}-{_SHARE.format("above")})<1E-9,here_kept="",TRUE)',
            "says what is kept, but the store does not change here: clear it",
        ),
    ),
)


FORMED = (
    Formed("fact", stage_rows.FACTS, stage_rows.facts()),
    Formed("hand", stage_rows.RUN, stage_rows.run()),
    Formed("high", stage_rows.RUN, stage_rows.run("_hi", "MAX")),
    Formed("low", stage_rows.RUN, stage_rows.run("_lo", "MIN")),
    Formed("seq", stage_rows.STAGES, stage_rows.stages("hand", "tau")),
    Formed("high_fast", stage_rows.STAGES, stage_rows.stages("high", "tau_lo", "_hi")),
    Formed("high_slow", stage_rows.STAGES, stage_rows.stages("high", "tau_hi", "_hi")),
    Formed("low_fast", stage_rows.STAGES, stage_rows.stages("low", "tau_lo", "_lo")),
    Formed("low_slow", stage_rows.STAGES, stage_rows.stages("low", "tau_hi", "_lo")),
    Formed("heat", stage_rows.HEAT, stage_rows.heat()),
    Formed("change", stage_rows.CHANGES, stage_rows.changes()),
)

_IN_STAGE = "t_ask-INDEX(stage_start,n_ask)"
_ASKED = stage_rows.after(
    _IN_STAGE,
    "INDEX(hand_begin,n_ask)",
    "INDEX(fact_heads,n_ask)",
    "INDEX(fact_tau,n_ask)",
    "INDEX(hand_stop,n_ask)",
)
_V_OR_A = "V of a capacitor, A of an inductor"

NOMINAL = Block(
    "Nominal",
    (
        Quantity(
            "n_last",
            "number of stages",
            "IF(stage_count=0,NA(),stage_count)",
            COUNT,
            "rows of the stage table that are filled in",
        ),
        Quantity(
            "n_ask",
            "stage that is on at t_ask",
            "IF(stage_count=0,NA(),SUMPRODUCT((stage_start<=t_ask)*1))",
            COUNT,
            "the last one that has started by then",
        ),
        Quantity(
            "y_ask",
            "value at t_ask",
            "FO_STAGES(t_ask,y_start,seq)",
            NUMBER,
            f"{_V_OR_A}: in each stage y = y_heads + (y_begin - y_heads) exp(-t / tau)",
            f'IF(INDEX(fact_tau,n_ask)<>"",{_ASKED},IF(INDEX(fact_rate,n_ask)<>"",'
            f"INDEX(hand_begin,n_ask)+INDEX(fact_rate,n_ask)*({_IN_STAGE}),"
            "INDEX(hand_begin,n_ask)))",
        ),
        Quantity(
            "t_cross",
            "moment at which y_level is first crossed",
            "FO_STAGES_CROSSING(y_level,y_start,seq,direction)",
            "time",
            "t = start of the stage + tau ln((y_heads - y_begin) / (y_heads - y_level)), in the "
            "first stage that passes the level; none when it is never passed",
            "IF(COUNT(change_cross)=0,NA(),MIN(change_cross))",
        ),
        Quantity(
            "E_end",
            "stored energy at t_end",
            "INDEX(change_energy,n_last)",
            "energy",
            "C V^2 / 2 or L I^2 / 2",
            "INDEX(change_energy_hand,n_last)",
        ),
        Quantity(
            "W_all",
            "heat in the resistances, all stages together",
            "IF(n_last>0,SUM(heat_ours))",
            "energy",
            "integral of i^2 R over each stage; table below",
            "IF(n_last>0,SUM(heat_hand))",
        ),
    ),
)

BOUNDS = Block(
    "Worst case: bounds carried from stage to stage",
    (
        Quantity("y_hf", "highest at t_ask, shortest time constants",
                 "FO_STAGES(t_ask,y_start_hi,high_fast)", NUMBER,
                 "every stage begins at the highest end of the one before"),
        Quantity("y_hs", "highest at t_ask, longest time constants",
                 "FO_STAGES(t_ask,y_start_hi,high_slow)", NUMBER, "the same"),
        Quantity("y_lf", "lowest at t_ask, shortest time constants",
                 "FO_STAGES(t_ask,y_start_lo,low_fast)", NUMBER,
                 "every stage begins at the lowest end of the one before"),
        Quantity("y_ls", "lowest at t_ask, longest time constants",
                 "FO_STAGES(t_ask,y_start_lo,low_slow)", NUMBER, "the same"),
        Quantity("y_high", "highest value at t_ask", "MAX(y_hf,y_hs)", NUMBER, _V_OR_A),
        Quantity("y_low", "lowest value at t_ask", "MIN(y_lf,y_ls)", NUMBER, _V_OR_A),
        Quantity(
            "y_peak",
            "largest magnitude at any time until t_end",
            "IF(n_last>0,MAX(MAX(high_begin),MAX(high_end),-MIN(low_begin),-MIN(low_end)))",
            NUMBER,
            f"{_V_OR_A}; within a stage the value moves one way, so that its ends decide",
        ),
        Quantity(
            "W_worst",
            "most heat in one stage",
            "IF(n_last>0,MAX(heat_worst))",
            "energy",
            "capacitor: C_hi (largest step)^2 / 2 (1 - exp(-2 T / tau_lo)); inductor: R_hi times "
            "the integral of i^2, the worst of the bounds with the shortest and longest tau",
        ),
    ),
)  # fmt: skip

AT_CHANGES = Block(
    "At the changes",
    (
        Quantity(
            "y_last",
            "largest magnitude at t_end, over the tolerances",
            "MAX(INDEX(high_end,n_last),-INDEX(low_end,n_last))",
            NUMBER,
            _V_OR_A,
        ),
        Quantity(
            "E_lost",
            "most energy lost at a change of the store",
            "MAX(0,"
            + ",".join(
                f"IF({row}>stage_count,0,INDEX(change_energy_hand,{row - 1})"
                f"*(1-IF({row}>stage_count,1,INDEX(fact_jump,{row}))))"
                for row in range(2, ROWS + 1)
            )
            + ")",
            "energy",
            "charge or flux kept: the energy just before times (1 - store before / store after)",
        ),
        Quantity(
            "V_kick",
            "largest voltage that a resistance puts on the inductor at a change",
            f"IF({CAPACITOR},0,MAX(change_stress))",
            "voltage",
            "V = i R at the start of the stage; 0 for a capacitor",
        ),
        Quantity(
            "I_rush",
            "largest current into or out of the capacitor at a change",
            f"IF({CAPACITOR},MAX(change_stress),0)",
            "current",
            "I = |E - V| / R at the start of the stage; 0 for an inductor",
        ),
        Quantity(
            "V_source",
            "largest source voltage",
            "IF(n_last>0,MAX(MAX(stage_E),-MIN(stage_E)))",
            "voltage",
            "of the stage table",
        ),
    ),
)

CHECKS = (
    Check("upper", "Highest value at t_ask (V or A)", "y_high", "y_upper", NUMBER,
          "Upper limit entered; bound over the tolerances of store, R, sources and start"),
    Check("lower", "Lowest value at t_ask (V or A)", "y_low", "y_lower", NUMBER,
          "Lower limit entered; bound over the same tolerances", Sense.AT_LEAST),
    Check("peak", "Largest magnitude at any time (V or A)", "y_peak", "y_rated", NUMBER,
          "Rating entered; the ends of the stages decide"),
    Check("heat", "Most heat in one stage", "W_worst", "W_rated", "energy",
          "Pulse rating of the weakest resistor; each stage's resistor is to take its own"),
)  # fmt: skip

HAZARDS = (
    Hazard(
        "Charge when the store changes",
        f'SUMPRODUCT((stage_kept="{CHARGE}")*1)>0',
        "A part is added while charge (or flux) is kept: the value jumps, and up to {E_lost} is "
        "lost in the contact that closes.",
    ),
    Hazard(
        "Part switched away charged",
        f'SUMPRODUCT((stage_kept="{VALUE}")*1)>0',
        "The store changes while its value is kept: a capacitor that is taken away keeps its "
        "charge, and an inductor that is taken away its current, which must have a path.",
    ),
    Hazard(
        "Level never crossed",
        "ISERROR(t_cross)",
        "The level is not crossed in the direction asked for, so there is no crossing time.",
    ),
    Hazard(
        "Inductive kick",
        "V_kick>MAX(V_source,1E-9)",
        "At a change the resistance puts {V_kick} on the inductor, more than any source: switch, "
        "insulation and people must stand it.",
    ),
    Hazard(
        "Energy left",
        "E_end>0.1",
        "At the end the store still holds {E_end}.",
    ),
    Hazard(
        "Current chopped",
        f'IF({CAPACITOR},FALSE,SUMPRODUCT((stage_mode="{HELD}")*1)>0)',
        "An inductor is held only by a short circuit across it: an open circuit does not hold a "
        "current but breaks it in an arc.",
    ),
)

CURVE = Curve(
    end="t_end/1.25",
    time_unit="s",
    quantity=NUMBER,
    unit="",
    y_title="voltage of the capacitor in V, or current of the inductor in A",
    caption="First switching at 0. Highest and lowest are bounds over the tolerances, carried from "
    "stage to stage; the true value lies between them.",
    traces=(
        Trace("nominal", "FO_STAGES(t,y_start,seq)"),
        Trace(
            "highest", "MAX(FO_STAGES(t,y_start_hi,high_fast),FO_STAGES(t,y_start_hi,high_slow))"
        ),
        Trace("lowest", "MIN(FO_STAGES(t,y_start_lo,low_fast),FO_STAGES(t,y_start_lo,low_slow))"),
    ),
    levels=(Level("level", "y_level"), Level("rated", "y_rated")),
    moments=(Moment("moment asked for", "t_ask"),),
    marks=(Mark("level crossed", "t_cross", "y_level"),),
    points=160,
    from_zero=False,
)

CAUTIONS = (
    Caution(
        "A stage that does not happen",
        "The calculation believes the table: a contactor that sticks, a fuse that has blown or a "
        "resistor that has failed open leaves the store as it was. Measure before touching; never "
        "take the time for the proof.",
    ),
    Caution(
        "A held capacitor stays charged",
        "Between stages nothing discharges it but its own leakage. It is to be discharged, proved "
        "dead on every pole, shorted and earthed before anyone reaches in.",
    ),
    Caution(
        "Joining unequal voltages",
        "Closing a contact between capacitors at different voltages, or onto a source, drives "
        "a current that only the wiring limits. It welds contacts and throws metal.",
    ),
    Caution(
        "Opening an inductor",
        "The current goes on whatever the switch does. Every stage must give it a path; where "
        "there is none it makes one, as an arc.",
    ),
    Caution(
        "Hot resistors",
        "The heat of a stage is in the resistor when the stage ends. A sequence that repeats "
        "before it has cooled adds up.",
    ),
)

BASIS = Basis(
    method=(
        "In each stage y = y_heads + (y_begin - y_heads) exp(-t / tau), tau = R C or L / R, "
        "y_heads = E for a capacitor and E / R for an inductor; a constant current gives dV/dt = "
        "I / C. The value goes on from stage to stage, unless the store changes: then charge or "
        "flux (y C, y L) or the value itself is kept, as the table says.",
        "Bounds: the highest value is found from the highest start, the highest level and the "
        "worse of both extremes of the time constant, stage by stage; the lowest likewise. This is "
        "never too low: where one tolerance is common to all stages it is somewhat too high.",
    ),
    assumptions=(
        "One capacitor or inductor, constant R and E within a stage, switching in no time.",
        "The tolerances of R and of E hold for every row of the table alike; I has that of E.",
        "A diode lets the current go on in its direction at the start of the stage, and stops it "
        "at 0. Its voltage is to be entered as part of E.",
        "What happens between the last stage's start and t_end is the last row.",
    ),
    sources=(
        "Closed form of tau dy/dt + y = x in each stage; Joule's law.",
        "Ratings and limits: entered by the engineer, confirm against the edition in force.",
    ),
    not_covered=(
        "Contact bounce and switching times, saturation, leakage while held, voltage across an "
        "opening switch beyond i R, tolerances that differ from row to row, and tolerances of the "
        "moments.",
    ),
)

_R, _X, _TAU = (f"INDEX({name},here_row)" for name in ("stage_R", "fact_x", "fact_tau"))
_TRACED = (
    f'IF({CAPACITOR},"R C = "&FO_TEXT({_R},"ohm",3)&" x "&FO_TEXT({_X},"F",3),'
    f'"L / R = "&FO_TEXT({_X},"H",3)&" / "&FO_TEXT({_R},"ohm",3))&" = "&FO_TEXT({_TAU},"s",4)'
)
LISTING = Listing(
    "stages",
    "Stage by stage, nominal",
    (
        ListColumn(
            "stage", "stage, from", 'here_row&": "&FO_TEXT(INDEX(stage_start,here_row),"s",4)'
        ),
        ListColumn(
            "tau",
            "time constant, from R and the store",
            f'IF({_TAU}="",INDEX(stage_mode,here_row),{_TRACED})',
        ),
        ListColumn(
            "begin", "just after the change", "INDEX(change_after,here_row)", "voltage", 1, UNIT
        ),
        ListColumn("end", "at its end", "INDEX(change_end,here_row)", "voltage", 2, UNIT),
        ListColumn("energy", "stored at its end", "INDEX(change_energy,here_row)", "energy"),
        ListColumn("heat", "heat in R", "INDEX(heat_ours,here_row)", "energy"),
        ListColumn(
            "stress",
            "current of C, or voltage on L, at the change",
            "INDEX(change_stress,here_row)",
            "current",
            1,
            f'IF({CAPACITOR},"A","V")',
        ),
    ),
    ROWS,
    "here_row<=stage_count",
)

SHEET = Sheet(
    name="sequence",
    title="Switching sequence",
    question="what happens to a capacitor or an inductor over several switching stages?",
    purpose="To show what a capacitor or an inductor does over several switching stages: its value "
    "at each change and at the moment asked for, the energy stored, and the heat in each stage.",
    picture=Picture(
        "sequence.png",
        "From the start of each stage the store is joined to that row's source E through its R, "
        "is driven by its constant current I, or is held. The first switching is at t = 0.",
    ),
    groups=(STORE, SPREAD, QUESTION),
    blocks=(NOMINAL, BOUNDS, AT_CHANGES),
    worst_cases=(),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-015",
        "Hoist drive, d.c. link: on and off",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
    formed=FORMED,
    filled_in=(STAGE,),
    listings=(LISTING,),
)
"""The calc sheet."""
