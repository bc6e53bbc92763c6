"""The rows behind a stage table that the engineer fills in: formulas, one row a stage.

`facts` is what each stage is, `run` how the store goes through it by EXP and LN alone, `stages` the
same as a table for FO_STAGES. The stage table has the columns start, mode, R, share, E, I and kept;
the sheet has the inputs store, C_store, L_store, k_R, k_E and t_end.
"""

from __future__ import annotations

from collections.abc import Sequence

ROWS = 10
CAPACITOR = 'store="capacitor"'
THROUGH, DIODE, DRIVEN, HELD = "through R", "through R and diode", "constant current", "held"
CHARGE, VALUE = "charge/flux", "value"

FACTS = (
    "length", "x", "x_lo", "x_hi", "tau", "tau_lo", "tau_hi",
    "heads", "heads_lo", "heads_hi", "rate", "rate_lo", "rate_hi", "jump",
)  # fmt: skip
RUN = ("begin", "stop", "end")
STAGES = ("starts", "tau", "heads", "jump", "stops")
HEAT = ("until", "ours", "hand", "high_lo", "high_hi", "low_lo", "low_hi", "worst")
CHANGES = ("after", "end", "energy", "energy_hand", "goes", "cross", "stress")

Rows = tuple[tuple[str, ...], ...]


def fact(name: str, row: int | str) -> str:
    """A fact of a stage."""
    return f"INDEX(fact_{name},{row})"


def typed(name: str, row: int | str) -> str:
    """What the engineer typed for a stage."""
    return f"INDEX(stage_{name},{row})"


def after(time: str, begin: str, heads: str, tau: str, stop: str) -> str:
    """The value after a time of a stage through a resistance."""
    free = f"{heads}+({begin}-{heads})*EXP(-({time})/{tau})"
    return f'IF({stop}="",{free},IF({time}>={tau}*LN(1-{begin}/{heads}),0,{free}))'


def _every(formulas: Sequence[tuple[str, ...]]) -> Rows:
    """The rows, blank where the table has no stage."""
    return tuple(
        tuple(f'IF({row}>stage_count,"",{formula})' for formula in line)
        for row, line in enumerate(formulas, start=1)
    )


def facts() -> Rows:
    """What each stage is, with the extremes of it."""
    return _every([_facts(row) for row in range(1, ROWS + 1)])


def _facts(row: int) -> tuple[str, ...]:
    r, e, i = (typed(name, row) for name in ("R", "E", "I"))
    mode, share = typed("mode", row), typed("share", row)
    until = f"IF({row}=stage_count,t_end,{typed('start', min(row + 1, ROWS))})"

    def through(formula: str) -> str:
        return f'IF(OR({mode}="{THROUGH}",{mode}="{DIODE}"),{formula},"")'

    def store(end: str) -> str:
        return f'IF({CAPACITOR},C_store{end},L_store{end})*IF({share}="",1,{share})'

    def tau(end: str, other: str) -> str:
        return through(f"IF({CAPACITOR},{r}*k_R{end}*here_x{end},here_x{end}/({r}*k_R{other}))")

    def heads(source: str, resistance: str) -> str:
        return f"{e}*k_E{source}/IF({CAPACITOR},1,{r}*k_R{resistance})"

    def drift(source: str, store: str) -> str:
        return f"{i}*k_E{source}/here_x{store}"

    def driven(formula: str) -> str:
        return f'IF({mode}="{DRIVEN}",{formula},"")'

    low, high = ("_lo", "_hi"), ("_hi", "_lo")
    changed = f'IF({typed("kept", row)}="{CHARGE}",above_x/here_x,1)' if row > 1 else "1"
    return (
        f"{until}-{typed('start', row)}",
        *(store(end) for end in ("", "_lo", "_hi")),
        *(tau(*ends) for ends in (("", ""), low, high)),
        through(heads("", "")),
        through(f"IF({e}>=0,{heads(*low)},{heads(*high)})"),
        through(f"IF({e}>=0,{heads(*high)},{heads(*low)})"),
        driven(drift("", "")),
        driven(f"IF({i}>=0,{drift(*low)},{drift(*high)})"),
        driven(f"IF({i}>=0,{drift(*high)},{drift(*low)})"),
        changed,
    )


def run(end: str = "", worst: str = "") -> Rows:
    """Start, place of a stop and end of each stage: nominal, or the "_lo" or "_hi" bound.

    A bound takes the worst end over both extremes of the time constant, by `worst`, MIN or MAX.
    """
    rows = []
    for row in range(1, ROWS + 1):
        level, length = fact(f"heads{end}", row), fact("length", row)
        taus = ("tau_lo", "tau_hi") if worst else ("tau",)
        ends = [after(length, "here_begin", level, fact(tau, row), "here_stop") for tau in taus]
        last = f"{worst}({','.join(ends)})" if worst else ends[0]
        drift = f"here_begin+{fact(f'rate{end}', row)}*{length}"
        before = "above_end" if row > 1 else f"y_start{end}"
        rows.append(
            (
                f"{before}*{fact('jump', row)}",
                f'IF({typed("mode", row)}="{DIODE}",IF(here_begin*{level}<0,0,""),"")',
                f'IF({fact("tau", row)}<>"",{last},IF({fact("rate", row)}<>"",{drift},here_begin))',
            )
        )
    return _every(rows)


def stages(of: str, tau: str, end: str = "") -> Rows:
    """A table for FO_STAGES; that of a bound begins every stage anew at the bound."""
    rows = []
    for row in range(1, ROWS + 1):
        time, begin = fact(tau, row), f"INDEX({of}_begin,{row})"
        rate = fact(f"rate{end}", row)
        rows.append(
            (
                typed("start", row),
                f'IF({time}<>"",{time},IF({rate}<>"","rate","hold"))',
                f'IF({time}<>"",{fact(f"heads{end}", row)},{rate})',
                begin if end else f'IF({fact("jump", row)}=1,"",{begin})',
                f"INDEX({of}_stop,{row})",
            )
        )
    return _every(rows)


def _squared(begin: str, heads: str, tau: str, time: str) -> str:
    """The integral of the square of a step response."""
    return (
        f"({heads}^2*{time}+2*{heads}*({begin}-{heads})*{tau}*(1-EXP(-{time}/{tau}))"
        f"+({begin}-{heads})^2*{tau}/2*(1-EXP(-2*{time}/{tau})))"
    )


def heat() -> Rows:
    """Heat of the resistance in each stage: until when it flows, both ways, and over the bounds."""
    return _every([_heat(row) for row in range(1, ROWS + 1)])


def _heat(row: int) -> tuple[str, ...]:
    begin, level, tau = f"INDEX(hand_begin,{row})", fact("heads", row), fact("tau", row)
    length, r, i = fact("length", row), typed("R", row), typed("I", row)
    stops = f"MIN({length},{tau}*LN(1-{begin}/{level}))"
    ours = (
        f'IF({CAPACITOR},FO_DISSIPATED({r}*k_R,"voltage",{tau},{begin}-{level},0,0,here_until),'
        f'FO_DISSIPATED({r}*k_R,"current",{tau},{begin},{level},0,here_until))'
    )
    hand = (
        f"IF({CAPACITOR},{fact('x', row)}/2*({begin}-{level})^2*(1-EXP(-2*here_until/{tau})),"
        f"{r}*k_R*{_squared(begin, level, tau, 'here_until')})"
    )

    def driven(end: str) -> str:
        flows = f"({i}*k_E{end})^2*{r}*k_R{end}*{length}"
        return f'IF({fact("rate", row)}="",0,IF({r}="",0,{flows}))'

    apart = (
        f"MAX(ABS(INDEX(low_begin,{row})-{fact('heads_hi', row)}),"
        f"ABS(INDEX(high_begin,{row})-{fact('heads_lo', row)}))"
    )
    of_capacitor = f"{fact('x_hi', row)}/2*{apart}^2*(1-EXP(-2*{length}/{fact('tau_lo', row)}))"
    # the bounds of the current with both extremes of tau, each until a diode stops it
    bounds = [
        (of, f"INDEX({of}_begin,{row})", fact(f"heads{end}", row), time)
        for of, end in (("high", "_hi"), ("low", "_lo"))
        for time in ("lo", "hi")
    ]
    untils, corners = [], []
    for of, first, last, time in bounds:
        longest = fact(f"tau_{time}", row)
        stopped = f"MIN({length},{longest}*LN(1-{first}/{last}))"
        untils.append(f'IF({tau}="","",IF(INDEX({of}_stop,{row})="",{length},{stopped}))')
        corners.append(_squared(first, last, longest, f"here_{of}_{time}"))
    of_inductor = f"{r}*k_R_hi*MAX({','.join(corners)})"
    return (
        f'IF({tau}="",{length},IF(INDEX(hand_stop,{row})="",{length},{stops}))',
        f'IF({tau}="",{driven("")},IF(here_until=0,0,{ours}))',
        f'IF({tau}="",{driven("")},{hand})',
        *untils,
        f'IF({tau}="",{driven("_hi")},IF({CAPACITOR},{of_capacitor},{of_inductor}))',
    )


def changes() -> Rows:
    """Value and energy at each change, the moment at which a level is crossed, the stress."""
    return _every([_changes(row) for row in range(1, ROWS + 1)])


def _changes(row: int) -> tuple[str, ...]:
    following = min(row + 1, ROWS)
    begin, end, x = f"INDEX(hand_begin,{row})", f"INDEX(hand_end,{row})", fact("x", row)
    tau, rate, level = fact("tau", row), fact("rate", row), fact("heads", row)
    before = "y_start" if row == 1 else f"INDEX(hand_end,{row - 1})"
    at_end = (
        f"IF({row}=stage_count,FO_STAGES(t_end,y_start,seq),"
        f"FO_STAGES({typed('start', following)},y_start,seq)/{fact('jump', following)})"
    )
    goes_on = (
        f'IF({tau}<>"",IF(INDEX(hand_stop,{row})="",{level},0),{end}+IF({rate}="",0,{rate}*1E9))'
    )

    def passes(a: str, b: str) -> str:
        way = (
            f'OR(direction="either",AND(direction="rising",{b}>{a}),'
            f'AND(direction="falling",{b}<{a}))'
        )
        return f"AND(({a}-y_level)*(y_level-{b})>0,{way})"

    inside = f'IF({tau}="",(y_level-{begin})/{rate},{tau}*LN(({level}-{begin})/({level}-y_level)))'
    crosses = (
        f"IF({passes(before, begin)},{typed('start', row)},"
        f'IF({passes(begin, "here_goes")},{typed("start", row)}+{inside},""))'
    )
    r = f"({typed('R', row)}*k_R)"
    return (
        f"FO_STAGES({typed('start', row)},y_start,seq)",
        at_end,
        f"IF({CAPACITOR},FO_ENERGY_C({x},here_end),FO_ENERGY_L({x},here_end))",
        f"{x}*{end}*{end}/2",
        f"IF({row}=stage_count,{goes_on},{end})",
        crosses,
        f'IF({tau}="",0,IF({CAPACITOR},ABS({level}-{begin})/{r},ABS({begin})*{r}))',
    )
