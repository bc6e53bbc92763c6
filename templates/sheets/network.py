"""Time constant, first and last state and response of the engineer's own first-order network.

The elements are typed as a table and read back in words. Three sets of values are calculated: as
entered, slow and fast, in which all resistances, all stores and all sources move together.
"""

from __future__ import annotations

from tausheet.templates.model import (
    COUNT,
    NUMBER,
    Basis,
    Block,
    Caution,
    Check,
    Choice,
    Column,
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
    NumberColumn,
    Picture,
    Quantity,
    Rule,
    Sense,
    Sheet,
    Table,
    TextColumn,
    Tolerance,
    Trace,
    WordColumn,
)

PARTS, EXTRAS, SHAPED, STORES = 20, 6, 4, 6

# kind: what its value is measured in, the base unit first, and what its spread goes with
KINDS: dict[str, tuple[tuple[str, ...], str]] = {
    "resistor": (("ohm", "mohm", "kohm", "Mohm"), "R"),
    "capacitor": (("F", "mF", "uF", "nF", "pF"), "X"),
    "inductor": (("H", "mH", "uH"), "X"),
    "voltage source": (("V", "mV", "kV"), "S"),
    "current source": (("A", "mA", "uA"), "S"),
    "switch": (("-",), ""),
    "voltage-controlled voltage source": (("-",), ""),
    "voltage-controlled current source": (("S", "mS"), ""),
    "current-controlled voltage source": (("ohm", "kohm"), ""),
    "current-controlled current source": (("-",), ""),
    "op-amp": (("-",), ""),
}
PREFIXES = {"m": (1.0, 1e3), "u": (1.0, 1e6), "n": (1.0, 1e9), "p": (1.0, 1e12),
            "k": (1e3, 1.0), "M": (1e6, 1.0)}  # fmt: skip
SHAPES = ("constant", "step", "ramp", "slope", "sine", "decay", "pulse", "square")


def _shown(unit: str) -> str:
    return unit.replace("ohm", "Ω").replace("u", "µ")


def _size(unit: str, base: str) -> tuple[float, float]:
    return (1.0, 1.0) if unit == base else PREFIXES[unit.removesuffix(base)]


FITS = [
    (kind, _shown(unit), *_size(unit, units[0])) for kind, (units, _) in KINDS.items()
    for unit in units
]  # fmt: skip
UNITS = tuple(dict.fromkeys(unit for _, unit, _, _ in FITS))

_ONE_OF = 'OR(here_kind="resistor",here_kind="capacitor",here_kind="inductor")'

PART = EntryTable(
    "part",
    "Elements",
    (
        TextColumn("name", "name"),
        WordColumn("kind", "kind", tuple(KINDS)),
        TextColumn("from", "from node"),
        TextColumn("to", "to node"),
        NumberColumn("value", "value; switch: 1 closed, 0 open", NUMBER, (), -1e12, 1e12,
                     "no element lies outside this", needed=False),
        WordColumn("unit", "unit", UNITS),
        NumberColumn("before", "value until t = 0, if another", NUMBER, (), -1e12, 1e12,
                     "no element lies outside this", needed=False),
    ),
    PARTS,
    (
        ("Supply", "voltage source", "ground", "plus", "110", "V", ""),
        ("Contact", "switch", "plus", "coil", "0", "-", "1"),
        ("Economy", "resistor", "plus", "coil", "60", "ohm", ""),
        ("Coil_R", "resistor", "coil", "iron", "40", "ohm", ""),
        ("Coil_L", "inductor", "iron", "ground", "4", "H", ""),
        ("Damper", "resistor", "coil", "ground", "400", "ohm", ""),
    ),
    "circuit diagram of the holding brake; coil measured, armature closed",
    rules=(
        Rule('IF(here_kind="op-amp",here_value="",ISNUMBER(here_value))',
             "needs its value as a number (an op-amp has none)"),
        Rule(f"IF({_ONE_OF},here_value>0,TRUE)",
             "has a resistance, capacitance or inductance that is not above 0"),
        Rule(f'IF(AND({_ONE_OF},here_before<>""),here_before>0,TRUE)',
             "has a value until t = 0 that is not above 0"),
        Rule('IF(here_kind="switch",OR(here_value=0,here_value=1),TRUE)',
             "a switch has the value 1, closed, or 0, open"),
        Rule('IF(AND(here_kind="switch",here_before<>""),OR(here_before=0,here_before=1),TRUE)',
             "a switch is 1, closed, or 0, open, until t = 0"),
        Rule("SUMPRODUCT(EXACT(here_kind,fits_kind)*EXACT(here_unit,fits_unit))=1",
             "its unit does not fit its kind: pick one that does, - for switches, gains, op-amps"),
    ),
    least=2,
    row="element",
)  # fmt: skip

_KNOWN = "SUMPRODUCT((part_name=here_element)*1)=1"

EXTRA = EntryTable(
    "extra",
    "Start values and controls, if any",
    (
        TextColumn("element", "element"),
        TextColumn("control", "controlled by: two nodes, or an element", needed=False, span=2),
        NumberColumn("start", "start of a store, V or A", NUMBER, (), -1e9, 1e9,
                     "no store is charged beyond it", needed=False),
    ),
    EXTRAS,
    (),
    "circuit diagram of the holding brake: none",
    rules=(
        Rule(_KNOWN, "is no element of the table above, or more than one: spell it the same"),
        Rule('OR(here_control<>"",here_start<>"")',
             "says neither what controls the element nor where it starts"),
    ),
    least=0,
    row="line",
)  # fmt: skip

SHAPE = EntryTable(
    "wave",
    "Shapes added by sources from t = 0, if any",
    (
        TextColumn("element", "element"),
        WordColumn("shape", "shape; A to E as for FO_SUPERPOSE, in base SI", SHAPES),
        *(
            NumberColumn(letter, letter, NUMBER, (), -1e12, 1e12, "nothing lies outside this",
                         needed=False)
            for letter in "ABCDE"
        ),
    ),
    SHAPED,
    (),
    "circuit diagram of the holding brake: none",
    rules=(Rule(_KNOWN, "is no element of the table above, or more than one: spell it the same"),),
    least=0,
    row="line",
)  # fmt: skip

ASK = EntryTable(
    "ask",
    "Quantity that is looked at",
    (
        WordColumn("what", "what", ("voltage at", "voltage across", "current through"), span=2),
        TextColumn("name", "node or element", span=2),
    ),
    1,
    (("current through", "Coil_L"),),
    "holding current decides whether the brake stays open",
    row="line",
)

PORT = EntryTable(
    "port",
    "Two nodes for the equivalent, if wanted",
    (
        TextColumn("plus", "positive node", span=2),
        TextColumn("minus", "other node", span=2),
    ),
    1,
    (("coil", "ground"),),
    "terminals of the brake coil",
    least=0,
    row="line",
)


def _share(symbol: str, what: str, demo: Demo) -> Input:
    return Input(
        symbol, f"{what}, as a share of what the table says", "ratio", ("%",), 0.1, 10.0,
        "a spread beyond a factor of ten is a slip", demo, Tolerance.ABSOLUTE,
    )  # fmt: skip


SPREAD = Group(
    "Spread, common to all elements of a kind",
    (
        _share("k_R", "resistances", Demo("100 %", "coil at 20 C to 60 C, data sheet of the brake",
                                          "96 %", "106 %")),
        _share("k_X", "capacitances and inductances", Demo("100 %", "measured, common practice",
                                                          "85 %", "115 %")),
        _share("k_S", "sources", Demo("100 %", "control supply, data sheet", "95 %", "105 %")),
    ),
)  # fmt: skip

QUESTION = Group(
    "What is asked of it",
    (
        Input("t_end", "time until which it is looked at", "time", ("s", "ms", "us", "min"),
              1e-12, 1e7, "no response of first order is looked at longer",
              Demo("400 ms", "control description of the brake")),
        Input("t_ask", "moment for which every element is listed", "time",
              ("s", "ms", "us", "min"), 0.0, 1e7, "no response of first order is looked at longer",
              Demo("20 ms", "free choice"),
              rules=(Rule("t_ask<=t_end", "lies after t_end, where nothing is looked at"),)),
        Input("y_level", "level of the quantity, in V or A", NUMBER, (), -1e9, 1e9,
              "no quantity of such a network lies outside this",
              Demo("1.4", "brake data sheet, closing of the armature is certain below")),
        Choice("direction", "direction in which it is crossed", ("rising", "falling", "either"),
               Demo("falling", "control description of the brake")),
        Input("t_allowed", "time allowed until the level is crossed", "time",
              ("s", "ms", "us", "min"), 0.0, 1e7, "no response of first order is looked at longer",
              Demo("200 ms", "control description of the brake")),
        Input("y_upper", "highest value allowed until t_end, in V or A", NUMBER, (), -1e9, 1e9,
              "no quantity of such a network lies outside this",
              Demo("3.2", "coil data sheet, short-time current")),
        Input("y_lower", "lowest value allowed until t_end, in V or A", NUMBER, (), -1e9, 1e9,
              "no quantity of such a network lies outside this",
              Demo("0.8", "brake data sheet, holding current"),
              rules=(Rule("y_lower<y_upper", "is not below y_upper: nothing can lie between"),)),
        Input("t_own", "time constant by your own reckoning", "time", ("ms", "s", "us", "min"),
              1e-12, 1e7, "a time constant is a time above 0",
              Demo("43 ms", "4 H / (40 Ω + 60 Ω parallel to 400 Ω), on paper")),
    ),
)  # fmt: skip

HEADINGS = ("Name", "Kind", "From", "To", "Value", "Before", "Start", "Control",
            "Shape", "A", "B", "C", "D", "E")  # fmt: skip


def _part(name: str, row: int | str) -> str:
    return f"INDEX(part_{name},{row})"


def _place(row: int) -> tuple[str, ...]:
    """Of each element: stores counted so far, size of its unit, its lines in the other tables."""
    kind, unit, name = _part("kind", row), _part("unit", row), _part("name", row)
    fits = f"EXACT({kind},fits_kind)*EXACT({unit},fits_unit)"
    before = "above_stores" if row > 1 else "0"
    ends = [
        f"SUMPRODUCT((part_from={node})*1)+SUMPRODUCT((part_to={node})*1)"
        for node in (_part("from", row), _part("to", row))
    ]
    used = (
        f'{before}+IF(OR({kind}="capacitor",{kind}="inductor"),1,0)',
        f"SUMPRODUCT({fits}*fits_over)",
        f"SUMPRODUCT({fits}*fits_under)",
        f"SUMPRODUCT(MAX((extra_element={name})*lines_extra))",
        f"SUMPRODUCT(MAX((wave_element={name})*lines_wave))",
        f"INDEX(kinds_group,MATCH({kind},kinds_kind,0))",
        f"MIN({','.join(ends)})",
    )
    return tuple(f'IF({row}>part_count,"",{formula})' for formula in used)


def _net(sets: str) -> tuple[tuple[str, ...], ...]:
    """The network as FO_NETWORK reads it: a heading row, then a row an element."""
    rows = [tuple(f'"{heading}"' for heading in HEADINGS)]
    for row in range(1, PARTS + 1):
        kind, group = _part("kind", row), f"INDEX(place_group,{row})"
        scale = f"*INDEX(place_over,{row})/INDEX(place_under,{row})"
        spread = f'*IF({group}="R",k_R{sets},IF({group}="X",k_X{sets},IF({group}="S",k_S{sets},1)))'
        extra, wave = f"INDEX(place_extra,{row})", f"INDEX(place_wave,{row})"

        def value(name: str, kind: str = kind, more: str = scale + spread, row: int = row) -> str:
            cell = _part(name, row)
            switch = f'IF(kind_is_switch,IF({cell}=1,"closed","open"),{cell}{more})'
            return f'IF({cell}="","",{switch})'.replace("kind_is_switch", f'{kind}="switch"')

        def looked_up(place: str, column: str) -> str:
            return f'IF({place}=0,"",INDEX({column},MAX(1,{place})))'

        cells = (
            *(_part(name, row) for name in ("name", "kind", "from", "to")),
            value("value"),
            value("before"),
            looked_up(extra, "extra_start"),
            looked_up(extra, "extra_control"),
            *(looked_up(wave, f"wave_{name}") for name in ("shape", *"ABCDE")),
        )
        rows.append(tuple(f'IF({row}>part_count,"",{cell})' for cell in cells))
    return tuple(rows)


def _same_but(of: str, sets: str) -> tuple[tuple[str, ...], ...]:
    """Another set of values: only Value and Before differ from those of a table."""
    fresh = _net(sets)
    return tuple(
        tuple(
            cell if number == 0 or heading in ("Value", "Before") else
            f"INDEX({of}_{heading},{number + 1})"
            for heading, cell in zip(HEADINGS, row, strict=True)
        )
        for number, row in enumerate(fresh)
    )  # fmt: skip


def _state(row: int) -> tuple[str, ...]:
    """Voltage, current and power of an element at t_ask."""
    name = _part("name", row)
    return tuple(
        f'IF({row}>part_count,{blank},FO_NETWORK_AT(t_ask,net,"{what} "&{name}))'
        for what, blank in (("voltage across", '""'), ("current through", '""'), ("power in", "0"))
    )


def _store(row: int) -> tuple[str, ...]:
    """A store just before and just after t = 0, and at t_end."""
    at = f"MATCH({row},place_stores,0)"
    kind = f"INDEX(part_kind,{at})"
    return tuple(
        f'IF({row}>n_stores,"",{formula})'
        for formula in (
            f"INDEX(part_name,{at})",
            f'IF({kind}="capacitor","voltage across ","current through ")&here_name',
            f'IF({kind}="capacitor","V","A")',
            "FO_NETWORK_AT(-1,net,here_quantity)",
            "FO_NETWORK_AT(0,net,here_quantity)",
            "FO_NETWORK_AT(t_end,net,here_quantity)",
        )
    )


FORMED = (
    Formed("place", ("stores", "over", "under", "extra", "wave", "group", "ends"),
           tuple(_place(row) for row in range(1, PARTS + 1))),
    Formed("net", HEADINGS, _net("")),
    Formed("slow", HEADINGS, _same_but("net", "s")),
    Formed("fast", HEADINGS, _same_but("net", "f")),
    Formed("asked", ("quantity",), (('INDEX(ask_what,1)&" "&INDEX(ask_name,1)',),)),
    Formed("state", ("voltage", "current", "power"),
           tuple(_state(row) for row in range(1, PARTS + 1))),
    Formed("store", ("name", "quantity", "unit", "before", "after", "last"),
           tuple(_store(row) for row in range(1, STORES + 1))),
)  # fmt: skip

_V_OR_A = "V or A"
_COILS = 'SUMPRODUCT((part_kind="inductor")*1)>0'


_STORED = 'SUMPRODUCT((part_kind="capacitor")*1)+SUMPRODUCT((part_kind="inductor")*1)'


def _set(name: str, words: str, formulas: tuple[str, str, str]) -> tuple[Quantity, ...]:
    what = ("resistances", "stores", "sources")
    return tuple(
        Quantity(f"k_{letter}{name}", f"share of {of}, {words}", formula, "ratio",
                 "an inductor is slow with small resistances, a capacitor with large ones; sources "
                 "at the end that delays the crossing" if letter == "R" else "likewise")
        for letter, of, formula in zip("RXS", what, formulas, strict=True)
    )  # fmt: skip


SETS = Block(
    "Sets of values",
    (
        *_set("s", "slow", (f"IF({_COILS},k_R_lo,k_R_hi)", "k_X_hi",
                            'IF(direction="rising",k_S_lo,k_S_hi)')),
        *_set("f", "fast", (f"IF({_COILS},k_R_hi,k_R_lo)", "k_X_lo",
                            'IF(direction="rising",k_S_hi,k_S_lo)')),
        Quantity("n_elem", "elements read", "IF(part_count=0,NA(),part_count)", COUNT,
                 "rows of the table; the second way counts the names",
                 'IF(part_count=0,NA(),SUMPRODUCT((part_name<>"")*1))'),
        Quantity("n_stores", "stores among them",
                 f'IF(part_count=0,NA(),{_STORED})', COUNT,
                 "capacitors and inductors; the second way counts all and takes the others away",
                 "IF(part_count=0,NA(),part_count-"
                 + "-".join(f'SUMPRODUCT((part_kind="{kind}")*1)' for kind in KINDS
                            if KINDS[kind][1] != "X") + ")"),
    ),
)  # fmt: skip

NETWORK = Block(
    "The network from t = 0 on",
    (
        Quantity("n_order", "order", 'FO_NETWORK(net,"order")', COUNT,
                 "number of natural frequencies that are not zero; this sheet is for order 1"),
        Quantity("tau", "time constant", 'FO_NETWORK(net,"tau")', "time",
                 "tau = R C or L / R, with R as the store sees it"),
        Quantity("R_seen", "resistance that the store sees", 'FO_NETWORK(net,"resistance")',
                 "resistance", "sources at rest"),
        Quantity("tau_dev", "deviation from your own reckoning", "ABS(tau/t_own-1)", "ratio",
                 "|tau / t_own - 1|: there is no second way by built-in functions, so that a "
                 "reckoning on paper stands for it"),
        Quantity("tau_s", "time constant, slow", 'FO_NETWORK(slow,"tau")', "time", "set slow"),
        Quantity("tau_f", "time constant, fast", 'FO_NETWORK(fast,"tau")', "time", "set fast"),
    ),
)  # fmt: skip

_FIRST = {"net": "as entered", "slow": "slow", "fast": "fast"}
ASKED = Block(
    "The quantity asked for",
    (
        Quantity("y_before", "just before t = 0", "FO_NETWORK_AT(-1,net,asked_quantity)", NUMBER,
                 _V_OR_A),
        Quantity("y_after", "just after t = 0", "FO_NETWORK_AT(0,net,asked_quantity)", NUMBER,
                 _V_OR_A),
        Quantity("y_ask", "at t_ask", "FO_NETWORK_AT(t_ask,net,asked_quantity)", NUMBER, _V_OR_A),
        Quantity("y_last", "at t_end", "FO_NETWORK_AT(t_end,net,asked_quantity)", NUMBER, _V_OR_A),
        *(
            Quantity(f"{symbol}_{of[0]}", f"{words}, {said}", formula.format(of), kind, note)
            for symbol, words, formula, kind, note in (
                ("y_max", "highest until t_end",
                 'FO_NETWORK_PEAK({},asked_quantity,0,t_end,"max")', NUMBER, _V_OR_A),
                ("y_min", "lowest until t_end",
                 'FO_NETWORK_PEAK({},asked_quantity,0,t_end,"min")', NUMBER, _V_OR_A),
                ("t_at", "level first crossed",
                 "FO_NETWORK_CROSSING(y_level,{},asked_quantity,direction)", "time",
                 "no result where the level is never crossed"),
            )
            for of, said in _FIRST.items()
        ),
        Quantity("y_high", "highest of the three sets", "MAX(y_max_n,y_max_s,y_max_f)", NUMBER,
                 _V_OR_A),
        Quantity("y_low", "lowest of the three sets", "MIN(y_min_n,y_min_s,y_min_f)", NUMBER,
                 _V_OR_A),
        Quantity("t_late", "latest crossing of the three sets", "MAX(t_at_n,t_at_s,t_at_f)",
                 "time", "the level must be crossed in each"),
    ),
)  # fmt: skip

BALANCE = Block(
    "Balance, equivalent, jump",
    (
        Quantity("P_all", "sum of the magnitudes of all powers at t_ask",
                 "IF(part_count=0,NA(),SUMPRODUCT(ABS(state_power)))", "power",
                 "table of elements below"),
        Quantity("P_left", "power that is left over at t_ask, of it",
                 "IF(P_all=0,0,ROUND(ABS(SUM(state_power))/P_all,12))", "ratio",
                 "what sources give, the others take: the sum over all elements must be 0"),
        Quantity("jump", "largest jump of a store at t = 0, of the larger of both values",
                 "MAX("
                 + ",".join(
                     f"IF({row}>n_stores,0,ABS(INDEX(store_after,{row})-INDEX(store_before,{row}))"
                     f"/MAX(ABS(INDEX(store_after,{row})),ABS(INDEX(store_before,{row})),1E-300))"
                     for row in range(1, STORES + 1)
                 )
                 + ")", "ratio", "0 unless stores are forced together"),
        Quantity("V_port", "open-circuit voltage between the two nodes",
                 'FO_EQUIVALENT(net,INDEX(port_plus,1),INDEX(port_minus,1),"voltage")', "voltage",
                 "settled, capacitors open, inductors shorted"),
        Quantity("I_port", "short-circuit current",
                 'FO_EQUIVALENT(net,INDEX(port_plus,1),INDEX(port_minus,1),"current")', "current",
                 "from the positive node to the other"),
        Quantity("R_port", "equivalent resistance",
                 'FO_EQUIVALENT(net,INDEX(port_plus,1),INDEX(port_minus,1),"resistance")',
                 "resistance", "V_port / I_port"),
    ),
)  # fmt: skip

CHECKS = (
    Check("high", "Highest value until t_end (V or A)", "y_high", "y_upper", NUMBER,
          "Upper limit entered; the worst of the three sets of values"),
    Check("low", "Lowest value until t_end (V or A)", "y_low", "y_lower", NUMBER,
          "Lower limit entered; the worst of the three sets of values", Sense.AT_LEAST),
    Check("time", "Time until the level is crossed", "t_late", "t_allowed", "time",
          "Time entered; the latest of the three sets of values"),
    Check("balance", "Power left over", "P_left", "1E-9", NUMBER,
          "Tellegen's theorem: what the sources give is what the others take"),
    Check("own", "Deviation from your own reckoning of tau", "tau_dev", "0.05", "ratio",
          "5 %, common practice for a reckoning on paper"),
)  # fmt: skip

HAZARDS = (
    Hazard("Not of first order", "n_order<>1",
           "The network is not of first order (or cannot be read), so nothing here holds for it."),
    Hazard("Store jumps", "jump>1E-9",
           "A store is forced to another value at t = 0: charge or flux is kept and the rest of "
           "the energy goes into a spark or an arc."),
    Hazard("Node with one connection", "MIN(place_ends)<2",
           "A node is named only once: that is right for an open end alone, and else a slip in "
           "spelling. Read the elements back."),
    Hazard("More stores than are listed", f"n_stores>{STORES}",
           f"Only {STORES} stores are listed before and after t = 0."),
)  # fmt: skip

CURVE = Curve(
    end="t_end/1.25",
    time_unit="ms",
    quantity=NUMBER,
    unit="",
    y_title="quantity asked for, in V or A",
    caption="Switching at 0; before it, what held until then. The sets slow and fast move all "
    "resistances, stores and sources together.",
    traces=(
        Trace("as entered", "FO_NETWORK_AT(t,net,asked_quantity)"),
        Trace("slow", "FO_NETWORK_AT(t,slow,asked_quantity)"),
        Trace("fast", "FO_NETWORK_AT(t,fast,asked_quantity)"),
    ),
    levels=(Level("level", "y_level"), Level("lower limit", "y_lower")),
    marks=(Mark("level crossed, as entered", "t_at_n", "y_level"),),
    points=100,
    from_zero=False,
)

CAUTIONS = (
    Caution("The network is not the machine",
            "What is not in the table does not exist for this sheet: wiring, leakage, a suppressor "
            "that has failed, iron that saturates. Compare with a measurement before anyone relies "
            "on it."),
    Caution("Opening the path of an inductor",
            "An open switch in series with an inductor drives its voltage to whatever breaks down "
            "first. If the table leaves the current no path, the real circuit makes one."),
    Caution("Stored energy stays",
            "A capacitor behind an open switch keeps its voltage for hours. Discharge it, prove "
            "it dead, short it and earth it before touching."),
    Caution("Brakes and holding magnets",
            "A current below the holding value drops the load. Where people can be under it, what "
            "is calculated here is never the only safeguard."),
)  # fmt: skip

BASIS = Basis(
    method=(
        "The equations of the network are set up from the table (modified nodal analysis) and "
        "reduced exactly to one store. Until t = 0 all is settled or at its start value; at "
        "t = 0 charge and flux are kept.",
        "Three sets of values: as entered; slow and fast, in which all resistances, all "
        "capacitances and inductances, and all sources' values are at an extreme together. "
        "Each check takes the worst of the three.",
        "There is no second way by built-in functions for a network of any shape: the balance of "
        "power and your own reckoning of tau stand for it.",
    ),
    assumptions=(
        "Linear, constant elements; switches close and open in no time.",
        "Elements of a kind vary together. This is no bound where they vary each for itself: then "
        "enter the extreme values in the table, one sheet each.",
        "Start values and shapes have no spread.",
        "Voltage across an element counts from its first to its second node, of a source from the "
        "second to the first; current flows from first to second inside.",
    ),
    sources=(
        "Modified nodal analysis, Thevenin's, Norton's and Tellegen's theorems: common practice.",
        "Limits: entered by the engineer, confirm against the edition in force.",
    ),
    not_covered=(
        "Networks of second or higher order, non-linear elements (diodes, saturation), and "
        "tolerances that differ from element to element.",
    ),
)

_I = "here_row"
_KIND = _part("kind", _I)
_BASE = f"INDEX(kinds_base,MATCH({_KIND},kinds_kind,0))"


def _said(cell: str) -> str:
    """A value in words."""
    number = f"FO_TEXT({cell}*INDEX(place_over,{_I})/INDEX(place_under,{_I}),{_BASE},4)"
    return f'IF({_KIND}="switch",IF({cell}=1,"closed","open"),{number})'


def _unless_blank(cell: str, words: str) -> str:
    return f'IF({cell}="","",{words})'


_NEXT = f"{_I}+1"
_ECHO = "&".join(
    (
        f'{_part("name", _I)}&": "&{_KIND}',
        _unless_blank(_part("value", _I), f'" "&{_said(_part("value", _I))}'),
        f'" from "&{_part("from", _I)}&" to "&{_part("to", _I)}',
        _unless_blank(_part("before", _I), f'", until t = 0 "&{_said(_part("before", _I))}'),
        _unless_blank(f"INDEX(net_Start,{_NEXT})", f'", starts at "&INDEX(net_Start,{_NEXT})'),
        _unless_blank(
            f"INDEX(net_Control,{_NEXT})", f'", controlled by "&INDEX(net_Control,{_NEXT})'
        ),
        _unless_blank(
            f"INDEX(net_Shape,{_NEXT})",
            f'", plus "&INDEX(net_Shape,{_NEXT})&" "&'
            + '&" "&'.join(f"INDEX(net_{letter},{_NEXT})" for letter in "ABCDE"),
        ),
    )
)

LISTINGS = (
    Listing(
        "elements",
        "The table read back, and every element at t_ask, as entered",
        (
            ListColumn("words", "element", _ECHO, span=5),
            ListColumn("voltage", "voltage", f"INDEX(state_voltage,{_I})", "voltage"),
            ListColumn("current", "current", f"INDEX(state_current,{_I})", "current"),
            ListColumn("power", "power taken", f"INDEX(state_power,{_I})", "power"),
        ),
        PARTS,
        f"{_I}<=part_count",
        lines=2,
    ),
    Listing(
        "stores",
        "Every store at t = 0, as entered",
        (
            ListColumn("words", "store", f"INDEX(store_quantity,{_I})", span=2),
            ListColumn("before", "just before", f"INDEX(store_before,{_I})", "voltage", 2,
                       f"INDEX(store_unit,{_I})"),
            ListColumn("after", "just after", f"INDEX(store_after,{_I})", "voltage", 2,
                       f"INDEX(store_unit,{_I})"),
            ListColumn("last", "at t_end", f"INDEX(store_last,{_I})", "voltage", 2,
                       f"INDEX(store_unit,{_I})"),
        ),
        STORES,
        f"{_I}<=n_stores",
    ),
)  # fmt: skip

TABLES = (
    Table(
        "fits",
        "Units that fit each kind",
        tuple(
            Column(name, name, tuple(row[at] for row in FITS))
            for at, name in enumerate(("kind", "unit", "over", "under"))
        ),
    ),
    Table(
        "kinds",
        "Kinds",
        (
            Column("kind", "kind", tuple(KINDS)),
            Column("base", "base unit", tuple(
                "1" if units[0] == "-" else units[0] for units, _ in KINDS.values())),
            Column("group", "spread", tuple(group or "-" for _, group in KINDS.values())),
        ),
    ),
    Table(
        "lines",
        "Numbers of lines",
        (
            Column("extra", "of extra", tuple(float(i) for i in range(1, EXTRAS + 1))),
            Column("wave", "of wave", tuple(float(i) for i in range(1, SHAPED + 1))),
        ),
    ),
)  # fmt: skip

SHEET = Sheet(
    name="network",
    title="First-order network",
    question="time constant, initial and final state and response of my own circuit",
    purpose="To show the time constant, the first and the last state and the response of a network "
    "of first order that is entered element by element, and that the quantity asked for keeps "
    "its limits.",
    picture=Picture(
        "network.png",
        "The network of the table is switched at t = 0: values and switches change from those "
        "until t = 0 to those from t = 0 on. One node is named ground. Drawn: y across a part.",
    ),
    groups=(SPREAD, QUESTION),
    blocks=(SETS, NETWORK, ASKED, BALANCE),
    worst_cases=(),
    checks=CHECKS,
    hazards=HAZARDS,
    curve=CURVE,
    cautions=CAUTIONS,
    basis=BASIS,
    demo=Heading(
        "Q4-CAL-014",
        "Holding brake: economy circuit",
        "Quay 4, harbour crane, drive retrofit",
        "A",
        "for checking",
    ),
    tables=TABLES,
    formed=FORMED,
    filled_in=(PART, EXTRA, SHAPE, ASK, PORT),
    listings=LISTINGS,
)
"""The calc sheet."""
