"""Tables that the engineer fills in: what of them reaches formulas, and what is wrong is named."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from filled import Filled
from openpyxl import load_workbook

from tausheet import templates
from tausheet.addin import calc, package
from tausheet.addin.embedded import Book
from tausheet.addin.make import make_sheet
from tausheet.addin.review.verify import verify
from tausheet.functions.errors import ErrorKind, TausheetError
from tausheet.templates import formulas, values_tables, writer
from tausheet.templates.model import (
    COUNT,
    Block,
    Check,
    EntryTable,
    Hazard,
    NumberColumn,
    Quantity,
    Rule,
    TextColumn,
    WordColumn,
)
from tausheet.templates.sheets import SHEETS

BOUNCE = EntryTable(
    "bounce",
    "Contact bounce",
    (
        NumberColumn("t_closed", "closed for", "time", ("ms", "us"), 1e-9, 1.0, "a test"),
        NumberColumn("t_open", "open for", "time", ("ms", "us"), 0.0, 1.0, "a test", needed=False),
        WordColumn("kind", "kind", ("make", "break"), needed=False),
        TextColumn("node", "node", needed=False),
        NumberColumn("n", "times", COUNT, (), 0, 9, "a test", needed=False),
    ),
    6,
    (
        ("2 ms", "1 ms", "make", "out", "1"),
        ("1 ms", "500 us", "", "7", ""),
        ("3 ms", "", "", "", ""),
    ),
    "oscilloscope, limit switch of the trolley",
    rules=(
        Rule("above_t_closed>0.0001", "the row above is too short"),
        Rule('IF(here_node="",TRUE,here_row<4)', "only the first three rows have a node"),
    ),
    least=2,
    row="bounce",
)  # fmt: skip
LONG = EntryTable(
    "measured",
    "Measured points",
    (
        NumberColumn("time", "time", "time", ("ms", "s"), -1.0, 1.0, "a test"),
        NumberColumn("level", "voltage", "voltage", ("V", "mV"), -100.0, 100.0, "a test"),
    ),
    120,
    tuple((f"{i} ms", f"{5 * (1 - math.exp(-i / 20)):.6f} V") for i in range(50)),
    "recorder",
    rules=(Rule("here_time>above_time", "times must rise"),),
    worksheet="Measured",
)
BASE = SHEETS["bleed"]
WHOLE = replace(
    BASE,
    filled_in=(BOUNCE, LONG),
    blocks=(
        *BASE.blocks,
        Block(
            "Bounce",
            (
                Quantity("t_closed_all", "closed", "SUM(bounce_t_closed)", "time", "sum"),
                Quantity("tau_fit", "fitted", 'FO_FIT(measured_time,measured_level,"tau")', "time",
                         "the blank rows at the end are no points"),
                Quantity("n_rows", "rows", "bounce_count", COUNT, "count"),
            ),
        ),
    ),
    checks=(*BASE.checks, Check("bounce", "bounce", "t_closed_all", "1", "time", "a test")),
    hazards=(*BASE.hazards, Hazard("Many rows", "measured_count>100", "There are many.")),
)  # fmt: skip


SHEET = replace(
    WHOLE,
    worst_cases=(),
    checks=WHOLE.checks[1:],
    curve=replace(BASE.curve, points=24, end="t_limit", marks=()),
)
"""Without the worst case, so that it computes fast."""


@pytest.fixture(scope="module")
def path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("tables") / "demo.xlsx"
    writer.build(SHEET, demo=True).save(path)
    return path


@pytest.fixture(scope="module")
def demo(path: Path) -> Filled:
    return Filled(SHEET, path)


@pytest.fixture(scope="module")
def in_calc(path: Path) -> Iterator[Filled]:
    with calc.Calc() as office, office.open(path) as book:
        yield Filled(SHEET, path, book)


def column(filled: Filled, name: str, rows: int) -> list[Any]:
    title, first = filled.places[name]
    letter, row = first.rstrip("0123456789"), int(first.lstrip("ABCDEFGHIJKLMNOPQRSTUVWXYZ"))
    return [filled.values[title][f"{letter}{row + i}"] for i in range(rows)]


def test_a_table_reaches_formulas_in_base_si_and_blank_where_it_is_blank(demo: Filled) -> None:
    demo.put()
    assert column(demo, "bounce_t_closed", 6) == [2e-3, 1e-3, 3e-3, "", "", ""]
    assert column(demo, "bounce_t_open", 6) == [1e-3, 5e-4, "", "", "", ""]
    assert column(demo, "bounce_kind", 6) == ["make", "", "", "", "", ""]
    assert column(demo, "bounce_node", 6) == ["out", "7", "", "", "", ""]  # a number is a name too
    assert column(demo, "bounce_n", 6) == [1.0, "", "", "", "", ""]
    assert demo["bounce_count"] == demo["n_rows"] == 3
    assert demo["t_closed_all"] == pytest.approx(6e-3, rel=1e-15)
    assert demo["tau_fit"] == pytest.approx(20e-3, rel=1e-5)  # the points were made with it
    assert demo["verdict"] == "PASS"
    assert demo["remark_on_bounce"].startswith("3 of 6 rows filled in; allowed: closed for 1 ns to")
    assert demo["remark_on_measured"].startswith("50 of 120 rows filled in")
    assert demo["tally"].endswith("23 of 23 inputs can be used")


FAULTS: list[tuple[dict[str, Any], str, str]] = [
    ({"value_of_bounce_t_closed_2": None}, "bounce", "bounce 2: closed for is missing"),
    ({"value_of_bounce_t_closed_2": "2 ms"}, "bounce", "bounce 2: closed for is not a number"),
    ({"value_of_bounce_t_closed_2": True}, "bounce", "bounce 2: closed for is not a number"),
    ({"value_of_bounce_t_closed_2": ErrorKind.DIV0}, "bounce", "bounce 2: closed for holds an er"),
    ({"value_of_bounce_t_closed_2": 0}, "bounce", "bounce 2: closed for is outside 1 ns to 1 s: a"),
    ({"value_of_bounce_t_closed_3": -1}, "bounce", "bounce 3: closed for is outside"),
    ({"value_of_bounce_t_open_1": 1e30}, "bounce", "bounce 1: open for is outside"),
    ({"value_of_bounce_t_open_3": "x"}, "bounce", "bounce 3: open for is not a number"),
    ({"value_of_bounce_kind_1": "brake"}, "bounce", "bounce 1: kind is not one of the list"),
    ({"value_of_bounce_node_1": "n" * 41}, "bounce", "bounce 1: node has more than 40"),
    ({"value_of_bounce_n_1": 1.5}, "bounce", "bounce 1: times is not a whole number"),
    ({"value_of_bounce_n_1": ErrorKind.NA}, "bounce", "bounce 1: times holds an error value"),
    ({"value_of_bounce_t_open_5": 1}, "bounce", "bounce 4: it is blank, but rows below"),
    ({"value_of_bounce_t_closed_1": 0.05}, "bounce", "bounce 2: the row above is too short"),
    ({"value_of_bounce_t_closed_4": 1, "value_of_bounce_node_4": "x"}, "bounce",
     "bounce 4: only the first three rows"),
    ({f"value_of_bounce_{c}_{r}": None for c in ("t_closed", "t_open", "kind", "node", "n")
      for r in (2, 3)}, "bounce", "Contact bounce: fill in 2 rows or more"),
    ({"unit_of_bounce_t_open": "V"}, "bounce", "open for: its unit does not measure a time: pick"),
    ({"unit_of_bounce_t_closed": None}, "bounce", "closed for: its unit does not measure a time"),
    ({"unit_of_bounce_t_closed": ErrorKind.REF}, "bounce", "closed for: its unit does not"),
    ({"unit_of_measured_level": "ms"}, "measured", "voltage: its unit does not measure a voltage"),
    ({"values_of_measured_time": "x"}, "measured", "row 1: time is not a number"),
    ({"values_of_measured_time": None}, "measured", "row 1: time is missing"),
    ({"values_of_measured_time": ErrorKind.VALUE}, "measured", "row 1: time holds an error value"),
    ({"values_of_measured_time": 1}, "measured", "row 2: times must rise"),
    ({"values_of_measured_level": 1e9}, "measured", "row 1: voltage is outside -100 V to 100 V"),
]  # fmt: skip


@pytest.mark.parametrize(("cells", "table", "sentence"), FAULTS)
def test_what_is_wrong_is_named_and_fails(
    demo: Filled, cells: dict[str, Any], table: str, sentence: str
) -> None:
    demo.put(**cells)
    assert demo[f"remark_on_{table}"].startswith(sentence)
    assert demo["verdict"] == "FAIL"
    assert demo["decided_by"].startswith(f"An input is missing or at fault: {table}")


def test_a_row_at_fault_gives_no_number(demo: Filled) -> None:
    demo.put(value_of_bounce_t_open_2="x")
    assert column(demo, "bounce_t_closed", 3) == [2e-3, ErrorKind.NA, 3e-3]
    assert isinstance(demo["t_closed_all"], ErrorKind)
    assert demo["check_bounce"] == "FAIL"


def test_libreoffice_says_the_same(demo: Filled, in_calc: Filled) -> None:
    for cells in ({}, *(FAULTS[i][0] for i in (0, 1, 3, 8, 12, 13, 15, 16, 20, 23))):
        mine, theirs = demo.put(**cells).values, in_calc.put(**cells).values
        for title, address in (
            *((demo.places[n]) for n in ("verdict", "remark_on_bounce", "remark_on_measured")),
            *(("Rows", cell) for cell in mine["Rows"]),
        ):
            ours, other = mine[title][address], theirs[title][address]
            if isinstance(ours, float) and isinstance(other, float):
                assert other == pytest.approx(ours, rel=1e-14, abs=0), (cells, address)
            else:
                assert other == ours, (cells, title, address)


def typed(given: dict[str, Any], demo: bool = False) -> values_tables.TypedTable:
    return values_tables.read(SHEET, given, demo)["bounce"]


def test_values_given_cell_by_cell() -> None:
    given = {"bounce.t_closed.1": "250 us", "bounce.t_closed.2": 0.002, "bounce.kind.1": "make"}
    table = typed({**given, "bounce.source": "scope"})
    assert table.units == {"t_closed": "us", "t_open": "ms"}
    assert table.cells == {(1, "t_closed"): 250, (2, "t_closed"): 2000, (1, "kind"): "make"}
    assert table.source == "scope"
    over = typed({"bounce.t_closed.1": "7 us", "bounce.t_open.2": None}, demo=True)
    assert over.units["t_closed"] == "us"  # the unit given decides, and the demo's are converted
    assert [over.cells[i, "t_closed"] for i in (1, 2, 3)] == [7, 1000, 3000]
    assert (2, "t_open") not in over.cells
    assert typed({"bounce.t_closed.1": 0.0005}).units["t_closed"] == "us"


@pytest.mark.parametrize(
    ("key", "value", "sentence"),
    [
        ("bonce.t_closed.1", "1 ms", 'no table "bonce"; its tables are: bounce, measured'),
        ("bounce.closed.1", "1 ms", 'no column "closed"; its columns are: t_closed, t_open'),
        ("bounce.t_closed.7", "1 ms", "names no row of bounce; write bounce.t_closed.1"),
        ("bounce.t_closed.0", "1 ms", "names no row"),
        ("bounce.t_closed", "1 ms", "names no row"),
        ("bounce.t_closed.x", "1 ms", "names no row"),
        ("bounce.t_closed.1", "1 V", '"V" is no unit of it; use ms, us'),
        ("bounce.t_closed.1", "soon", "not a number"),
        ("bounce.n.1", "1 s", "give the number alone"),
        ("bounce.kind.1", "brake", "use one of: make; break"),
        ("bounce.node.1", "\x07", "no workbook can hold"),
    ],
)
def test_values_refused(key: str, value: str, sentence: str) -> None:
    with pytest.raises(TausheetError, match=sentence):
        typed({key: value})


def test_a_text_is_never_taken_for_a_formula() -> None:
    workbook = writer.build(SHEET, {"bounce.node.1": "=1+1"}, demo=True)
    (title, cells), *_ = workbook.defined_names["value_of_bounce_node_1"].destinations
    cell = workbook[title][cells.replace("$", "").split(":")[0]]
    assert (cell.data_type, cell.value, cell.quotePrefix) == ("s", "=1+1", True)


def test_if_over_rows_stands_in_array_formulas_alone(path: Path) -> None:
    """Excel computes IF inside SUMPRODUCT for one row only unless the formula is an array's."""
    plain = [
        cell.value
        for row in load_workbook(path)["Rows"]
        for cell in row
        if isinstance(cell.value, str) and cell.value.startswith("=")
    ]
    assert len(plain) > 20
    for formula in plain:
        for inside in re.findall(r"SUMPRODUCT\((.*)", formula):
            assert not re.search(r"\bIF\([^(]*:", inside), formula


def test_a_blank_form_asks_for_the_table() -> None:
    workbook = writer.build(SHEET)
    values = Book(workbook).values()
    (title, cells), *_ = workbook.defined_names["remark_on_bounce"].destinations
    assert values[title][cells.replace("$", "").split(":")[0]].startswith("Contact bounce: fill in")


def test_only_the_cells_to_type_into_are_open(path: Path) -> None:
    workbook = load_workbook(path)
    own = workbook["Measured"]
    open_cells = {c.coordinate for row in own for c in row if not c.protection.locked}
    assert open_cells == {f"{a}{r}" for a in "AB" for r in range(4, 125)}
    assert all(cell.protection.locked for row in workbook["Rows"] for cell in row)
    lists = {v.formula1 for v in own.data_validations.dataValidation if v.type == "list"}
    assert lists == {'"ms,s"', '"V,mV"'}


def test_values_are_stored_in_every_row_of_a_long_table(path: Path) -> None:
    values = Book.load(path).values()
    stored = path.with_name("stored.xlsx")
    stored.write_bytes(package.with_values(path.read_bytes(), values))
    rows = load_workbook(stored, data_only=True)["Rows"]
    title, first = Filled(SHEET, stored).places["measured_level"]
    assert title == "Rows"
    at = rows[first]
    shown = [rows.cell(at.row + i, at.column).value for i in range(51)]
    assert shown[:50] == pytest.approx([5 * (1 - math.exp(-i / 20)) for i in range(50)], abs=6e-7)
    assert not shown[50]


def test_list_shows_the_columns(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(SHEETS, "bleed", SHEET)
    rows = {row[0]: row[1:] for row in templates.describe_inputs("bleed")}
    assert rows["bounce.t_closed.1 to 6"] == ("Contact bounce: closed for", "ms, µs", "2 ms")
    assert rows["bounce.kind.1 to 6"] == ("Contact bounce: kind", "make; break", "make")
    assert rows["bounce.node.1 to 6"] == ("Contact bounce: node", "a text", "out")


@pytest.mark.parametrize(
    ("table", "sentence"),
    [
        (replace(BOUNCE, columns=(*BOUNCE.columns, TextColumn("n", "n"))), "a column name twice"),
        (replace(BOUNCE, columns=(*BOUNCE.columns, TextColumn("count", "n"))), "one of its own"),
        (replace(BOUNCE, demo=(("1 ms",),)), "a demo that does not fit"),
        (replace(BOUNCE, rows=2), "a demo that does not fit"),
        (replace(BOUNCE, columns=tuple(replace(c, span=2) for c in BOUNCE.columns)), "wider than"),
        (replace(BOUNCE, rules=(Rule("here_t>0", ""),)), "uses here_t, which is not defined"),
        (replace(BOUNCE, rules=(Rule("PMT(1)>0", ""),)), "calls PMT, which is not allowed"),
        (replace(LONG, symbol="m_x", rules=(Rule("AND(here_time>0)", ""),)), "which AND cannot"),
        (
            replace(BOUNCE, columns=(*BOUNCE.columns[:2], WordColumn("kind", "k", ("a,b",)),
                                     *BOUNCE.columns[3:])),
            "no drop-down list can hold",
        ),
        (
            replace(
                BOUNCE, columns=(replace(BOUNCE.columns[0], units=("V",)), *BOUNCE.columns[1:])
            ),
            "t_closed offers a unit that does not fit",
        ),
        (replace(BOUNCE, symbol="R"), "R reads as a cell"),
        (replace(BOUNCE, symbol="m_x", rows=200), "can hold columns of quantities alone"),
    ],
)  # fmt: skip
def test_a_slip_in_a_table_stops_the_build(table: EntryTable, sentence: str) -> None:
    with pytest.raises(TausheetError, match=sentence):
        formulas.check(replace(BASE, filled_in=(table,)))


def test_verify_knows_the_rows_of_a_long_table(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """What stands in them are results: none is content that someone added, and none may differ."""
    monkeypatch.setitem(SHEETS, "bleed", SHEET)
    path = tmp_path / "made.xlsx"
    make_sheet("bleed", path, {}, demo=True)
    assert [one for one in verify(path).findings if one.counts] == []
    title, first = Filled(SHEET, path).places["measured_level"]
    below = f"{first.rstrip('0123456789')}20"
    path.write_bytes(package.with_values(path.read_bytes(), {title: {below: 99.0}}))
    found = [one for one in verify(path).findings if one.counts]
    assert [(one.kind, one.cell) for one in found] == [
        ("stale or overwritten value", f"{title}!{below}")
    ]
