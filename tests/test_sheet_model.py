"""The machinery of the calc sheets on a small sheet made for it: slips refused, corners, checks."""

from __future__ import annotations

import math
import re
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from tausheet.addin import embedded
from tausheet.functions.errors import TausheetError
from tausheet.templates import SHEETS, formulas, style, writer, writer_checks, writer_tables
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
    Formed,
    Group,
    Heading,
    Input,
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


def volts(symbol: str, **changes: Any) -> Input:
    made = Input(
        symbol,
        f"voltage {symbol}",
        "voltage",
        ("V", "kV"),
        -1000.0,
        1000.0,
        "a test",
        Demo("2 V", "a test", "1 V", "5 V"),
        Tolerance.ABSOLUTE,
    )
    return replace(made, **changes)


def share(symbol: str) -> Input:
    return Input(
        symbol, "a share", "ratio", ("%",), 0.0, 1.0, "a test",
        Demo("20 %", "a test", "10 %", "90 %"), Tolerance.ABSOLUTE,
    )  # fmt: skip


SMALL = Sheet(
    name="small",
    title="A small sheet",
    question="does it work?",
    purpose="To try.",
    picture=Picture("bleed.png", "Nothing is switched."),
    groups=(Group("Inputs", (volts("V_a"), share("d_on"))),),
    blocks=(
        Block(
            "Results",
            (
                Quantity("V_mid", "a middle", "V_a*d_on*(1-d_on)", "voltage", "V d (1 - d)",
                         "V_a*(d_on-d_on^2)"),
                Quantity("t_one", "a time", "FO_TAU_RC(1,1)", "time", "1 s"),
            ),
        ),
    ),
    worst_cases=(
        WorstCase("V_mid", "V_a*d_on*(1-d_on)", (Varies("V_a"), Varies("d_on", "0.5")), draws=10),
    ),
    checks=(Check("mid", "Middle", "V_mid_max", "1.5", "voltage", "a test"),),
    hazards=(),
    curve=Curve("t_one", "ms", "voltage", "kV", "voltage", "", (Trace("line", "V_mid"),),
                points=4),
    cautions=(Caution("None", "None."),),
    basis=Basis(("m",), ("a",), ("s",), ("n",)),
    demo=Heading("1", "small", "Quay 4", "A", "draft"),
)  # fmt: skip


def computed(tmp_path: Path, sheet: Sheet, **given: Any) -> Any:
    """Read a named cell of the sheet filled with its demo values, or with those given."""
    workbook = writer.build(sheet, given, demo=True)
    values = embedded.Book(workbook).values()

    def read(name: str) -> Any:
        title, cells = next(iter(workbook.defined_names[name].destinations))
        cell = cells.replace("$", "").split(":")[0]
        return values[title].get(cell, workbook[title][cell].value)

    return read


def test_extreme_inside_a_range_is_sought_there(tmp_path: Path) -> None:
    """V d (1 - d) is greatest at d = 1/2, not at 10 % or 90 % (elementary calculus)."""
    read = computed(tmp_path, SMALL)
    assert read("V_mid_max") == 5 * 0.25
    assert read("V_mid_min") == pytest.approx(1 * 0.09, rel=1e-15)
    assert read("V_mid_highest_corner") == "V_a highest, d_on at its inner extreme"
    assert read("verdict") == "PASS"
    # an inner extreme outside the limits of the part is not reached
    read = computed(tmp_path, SMALL, d_on="20 %", d_on_lo="10 %", d_on_hi="30 %")
    assert read("V_mid_max") == pytest.approx(5 * 0.3 * 0.7, rel=1e-15)


@pytest.mark.parametrize(
    ("sense", "value", "limit", "result"),
    [
        (Sense.AT_MOST, "60", "60", "PASS"),
        (Sense.AT_MOST, "60.0000000000001", "60", "PASS"),
        (Sense.AT_MOST, "60.000000001", "60", "FAIL"),
        (Sense.AT_LEAST, "59.999999999", "60", "FAIL"),
        (Sense.AT_LEAST, "60", "60", "PASS"),
        (Sense.AT_LEAST, "61", "60", "PASS"),
        (Sense.AT_MOST, "0", "0", "PASS"),
        (Sense.AT_MOST, "1E-300", "0", "FAIL"),
        (Sense.AT_MOST, "-1", "0", "PASS"),
        (Sense.AT_LEAST, "-1", "0", "FAIL"),
        (Sense.AT_LEAST, "1", "0", "PASS"),
        (Sense.AT_MOST, "-5", "-10", "FAIL"),
        (Sense.AT_MOST, "-15", "-10", "PASS"),
        (Sense.AT_LEAST, "-5", "-10", "PASS"),
        (Sense.AT_LEAST, "-15", "-10", "FAIL"),
        (Sense.AT_MOST, "NA()", "60", "FAIL"),
        (Sense.AT_MOST, "1", "NA()", "FAIL"),
        (Sense.AT_LEAST, '"many"', "60", "FAIL"),
        (Sense.AT_MOST, '""', "60", "FAIL"),
        (Sense.AT_LEAST, "1", '""', "FAIL"),
    ],
)
def test_checks(tmp_path: Path, sense: Sense, value: str, limit: str, result: str) -> None:
    check = Check("mid", "Middle", value, limit, "voltage", "a test", sense)
    read = computed(tmp_path, replace(SMALL, checks=(check,)))
    assert read("check_mid") == result
    assert read("verdict") == result


def changed(**changes: Any) -> Sheet:
    return replace(SMALL, **changes)


def with_quantity(quantity: Quantity) -> Sheet:
    first = SMALL.blocks[0]
    return changed(blocks=(replace(first, quantities=(*first.quantities, quantity)),))


HALVING = Formed(
    "halve",
    ("from", "to", "middle", "over"),
    (
        ("0", "V_a", "(here_from+here_to)/2", "here_middle^2>V_a"),
        *(
            (
                "IF(above_over,above_from,above_middle)",
                "IF(above_over,above_middle,above_to)",
                "(here_from+here_to)/2",
                "here_middle^2>V_a",
            ),
        )
        * 60,
    ),
)
RAMP = Formed("supply", ("shape", "a", "b", "c"), (('"ramp"', "V_a", "3", ""),))


def with_quantity_and(formed: Formed, quantity: Quantity) -> Sheet:
    return replace(with_quantity(quantity), formed=(formed,))


def test_formed_table_of_rows_that_build_on_the_row_above(tmp_path: Path) -> None:
    """Halving 60 times from 0 to 2 finds the square root of 2 (elementary arithmetic)."""
    root = Quantity("q_root", "a root", "INDEX(halve_middle,ROWS(halve_middle))", "ratio", "")
    read = computed(tmp_path, with_quantity_and(HALVING, root))
    assert read("q_root") == pytest.approx(2**0.5, rel=1e-15)


def test_formed_table_as_a_source_table(tmp_path: Path) -> None:
    """A ramp of 2 V in 3 s into tau = 1 s: y = 2/3 (t - 1 + exp(-t)) V, from the textbooks."""
    formula = "FO_CROSSING(1,1,0,supply)"
    found = Quantity("t_found", "crossing", formula, "time", "")
    t = computed(tmp_path, with_quantity_and(RAMP, found))("t_found")
    assert 2 / 3 * (t - 1 + math.exp(-t)) == pytest.approx(1, rel=1e-14)


def with_input(entry: Input | Choice) -> Sheet:
    return changed(groups=(Group("Inputs", (*SMALL.groups[0].entries, entry)),))


SLIPS = [
    (with_quantity(Quantity("q_one", "x", "V_x+1", "voltage", "")), "q_one uses V_x, which is not"),
    (with_quantity(Quantity("q_one", "x", "TODAY()", "time", "")), "calls TODAY, which is not"),
    (with_quantity(Quantity("q_one", "x", "q_one+1", "voltage", "")), "q_one depends on itself"),
    (with_quantity(Quantity("v_MID", "x", "1", "voltage", "")), "is used 2 times"),
    (with_quantity(Quantity("R1", "x", "1", "voltage", "")), "R1 reads as a cell"),
    (with_quantity(Quantity("C", "x", "1", "voltage", "")), "C reads as a cell"),
    (with_quantity(Quantity("verdict", "x", "1", "voltage", "")), "verdict is a name of"),
    (with_quantity(Quantity("V_A_LO", "x", "1", "voltage", "")), "differ only by case"),
    (
        with_quantity(Quantity("q_one", "x", "1", "time", "", "t_one*2")),
        "the second way of q_one depends on a function of ours .t_one",
    ),
    (
        with_quantity(Quantity("q_one", "x", "1", "time", "", "FO_TAU_RC(1,1)")),
        "the second way of q_one depends on a function of ours",
    ),
    (
        with_quantity_and(RAMP, Quantity("q_one", "x", "supply_d", "time", "")),
        "q_one uses supply_d, which is not",
    ),
    (
        changed(formed=(Formed("one", ("a",), (("above_a",),)),)),
        "row 1 of one, a, uses above_a, which is not",
    ),
    (
        with_quantity_and(
            Formed("one", ("a",), (("q_one",),)), Quantity("q_one", "x", "one_a", "time", "")
        ),
        "q_one depends on itself",
    ),
    (
        with_quantity_and(
            Formed("one", ("a", "b"), (("t_one", "here_a"),)),
            Quantity("q_one", "x", "1", "time", "", "one_b"),
        ),
        "the second way of q_one depends on a function of ours",
    ),
    (with_input(volts("V_b", units=("A",))), "V_b offers a unit that does not fit"),
    (with_input(volts("V_b", rules=(Rule("V_b>V_x", "x"),))), "a rule of V_b uses V_x"),
    (with_input(volts("V_b", rules=(Rule("V_b>q_one", "x"),))), "a rule of V_b uses q_one"),
    (
        changed(checks=(Check("mid", "M", "V_mid_hi", "1", "voltage", "x"),)),
        "check mid uses V_mid_hi, which is not defined",
    ),
    (
        changed(worst_cases=(WorstCase("V_x", "V_a", (Varies("V_a"),)),), checks=()),
        "V_x, which is no quantity",
    ),
    (
        changed(worst_cases=(WorstCase("V_mid", "V_a", (Varies("V_a"), Varies("d_on"))),)),
        "d_on varies, but the worst case of V_mid does not use it",
    ),
    (
        changed(worst_cases=(WorstCase("V_mid", "V_mid*V_a", (Varies("V_a"),)),)),
        "uses V_mid, which depends on the varied V_a",
    ),
    (
        changed(worst_cases=(WorstCase("V_mid", "V_a*t_one", (Varies("V_a"), Varies("t_one"))),)),
        "t_one varies but has no tolerance",
    ),
    (
        changed(curve=replace(SMALL.curve, traces=(Trace("line", "FO_STEP(t,1,0,V_z)"),))),
        "the curve uses V_z",
    ),
]


@pytest.mark.parametrize(("sheet", "message"), SLIPS, ids=[message for _, message in SLIPS])
def test_slips_of_a_sheet_module_stop_the_build(sheet: Sheet, message: str) -> None:
    with pytest.raises(TausheetError, match=message) as refused:
        writer.build(sheet)
    assert str(refused.value).startswith("small: ")


def test_inputs_that_wait_for_each_other_are_a_cycle() -> None:
    pair = (
        volts("V_b", rules=(Rule("V_b>V_c", "x"),)),
        volts("V_c", rules=(Rule("V_c<V_b", "x"),)),
    )
    sheet = changed(groups=(Group("Inputs", (*SMALL.groups[0].entries, *pair)),))
    with pytest.raises(TausheetError, match=r"V_[bc] depends on itself"):
        writer.build(sheet)


def test_names_and_calls_in_a_formula() -> None:
    assert formulas.names_in('IF(a_b="x_y",FO_STEP(c_d,1,0,-e_f),2)') == {"a_b", "c_d", "e_f"}
    assert formulas.functions_in("IF(1,FO_STEP(MAX(1,2)),2)") == {"IF", "FO_STEP", "MAX"}
    assert formulas.renamed('a_b*a_bc&"a_b"', {"a_b": "B4"}) == 'B4*a_bc&"a_b"'
    assert formulas.outer_call("FO_STEP(a,MAX(b,1),0,c)") == (
        "FO_STEP", ["a", "MAX(b,1)", "0", "c"],
    )  # fmt: skip
    assert formulas.outer_call("FO_STEP(1,1,0,1)+1") is None
    assert formulas.outer_call("1+FO_STEP(1,1,0,1)") is None


def test_every_unit_is_a_ratio_of_whole_numbers() -> None:
    """So that a conversion in cells rounds once: 4.7 mF is the double nearest to 0.0047."""
    assert writer_tables.ratio(0.001) == (1, 1000)
    assert writer_tables.ratio(1e-15) == (1, 1e15)
    assert writer_tables.ratio(1 / 3600) == (1, 3600)
    assert writer_tables.ratio(60.0) == (60, 1)
    assert {"µF", "uF", "\u03bcF"} <= set(writer_tables.spellings("uF"))
    assert {"kΩ", "kohm", "k\u2126"} <= set(writer_tables.spellings("kohm"))


def test_lines_needed() -> None:
    assert style.lines_needed("", 100, 9) == 1
    assert style.lines_needed("one", 100, 9) == 1
    assert style.lines_needed("word " * 20, 100, 9) > 5
    assert style.lines_needed("w" * 60, 100, 9) > 4


def test_passes_rounds_the_ratio_only() -> None:
    check = Check("a", "a", "x", "y", COUNT, "")
    assert "ROUND((x)/(y),12)<=1" in writer_checks.passes(check)


def test_negative_results_show_their_sign(tmp_path: Path) -> None:
    """Calc drops a sign that a conditional number format does not spell out."""
    negative = Quantity("V_low", "x", "-12.3456", "voltage", "x", "-12.3456")
    sheet = with_quantity(negative)
    workbook = writer.build(sheet, {}, demo=True)
    title, cells = next(iter(workbook.defined_names["V_low"].destinations))
    row = cells.replace("$", "").split(":")[0][1:]
    assert workbook[title][f"C{row}"].number_format == "General"
    values = embedded.Book(workbook).values()[title]
    assert (values[f"C{row}"], values[f"D{row}"]) == (-12.35, "V")
    assert style.RELATIVE.split(";")[1] == "[<0]-0.0%"


def test_plain_numbers_are_typed_shown_and_checked(tmp_path: Path) -> None:
    """A ratio such as X/R = 13.9 has no unit; one that fails never looks equal to its limit."""
    ratio = Input("X_to_R", "X/R of the feeder", NUMBER, (), 0.1, 100.0, "a test",
                  Demo("13.9", "a test"))  # fmt: skip
    row = Quantity("n_half", "half of it", "X_to_R/2", NUMBER, "X/R / 2")
    sheet = with_quantity(row)
    sheet = replace(
        sheet,
        groups=(Group("Inputs", (*SMALL.groups[0].entries, ratio)),),
        checks=(Check("half", "Half", "n_half", "6.95", NUMBER, "a test"),),
    )
    assert computed(tmp_path, sheet)("verdict") == "PASS"
    read = computed(tmp_path, sheet, X_to_R="13.900002")
    assert (read("n_half"), read("verdict")) == (13.900002 / 2, "FAIL")
    assert read("decided_by").startswith("Half: 6.950001")
    with pytest.raises(TausheetError, match='"kV" is no unit of it; give the number alone'):
        computed(tmp_path, sheet, X_to_R="13.9 kV")


def test_the_worked_example_of_the_guide_is_a_sheet(tmp_path: Path) -> None:
    """360 s x 1.25 x ln(0.8 / 0.1) = 935.7 s, of 1200 s allowed (by hand)."""
    guide = (Path(__file__).parent.parent / "DEVELOPERS.md").read_text(encoding="utf-8")
    (code,) = re.findall(r"```python\n(.*?)```", guide, re.DOTALL)
    room: dict[str, Any] = {}
    exec(code, room)
    read = computed(tmp_path, room["SHEET"])
    assert read("t_ready_max") == pytest.approx(360 * 1.25 * math.log(8), rel=1e-14)
    assert (read("verdict"), read("warning_warmed_up_in_part")) == ("PASS", "-")
    late = computed(tmp_path, room["SHEET"], t_allowed="15 min")
    assert (late("verdict"), late("warning_warmed_up_in_part")) == ("FAIL", "WARNING")


def test_no_two_demo_pages_have_one_document_number() -> None:
    numbers = [sheet.demo.number for sheet in SHEETS.values()]
    assert len(set(numbers)) == len(numbers)
