"""Names, signatures and docstrings of every cell function: the wizard's help comes from them."""

from __future__ import annotations

import doctest
import inspect
import re
import sys
from pathlib import Path

import pytest

from tausheet import functions
from tausheet.functions.arguments import REQUIRED
from tausheet.functions.catalogue import CATALOGUE, CellFunction

SPECIFIED = {
    line.split("(")[0]: line
    for line in Path(__file__)
    .with_name("references")
    .joinpath("cell-functions.txt")
    .read_text()
    .splitlines()
    if not line.startswith("#")
}
SECTIONS = ["Arguments", "Result", "Errors", "Assumes", "Example", "References"]


def every(entry: CellFunction) -> str:
    return inspect.getdoc(entry.kernel) or ""


def test_every_specified_function_is_there_and_no_other() -> None:
    assert set(CATALOGUE) == set(SPECIFIED)
    assert len(CATALOGUE) == 65
    public = {entry.python_name for entry in CATALOGUE.values()}
    assert public <= set(functions.__all__)
    for entry in CATALOGUE.values():
        assert getattr(functions, entry.python_name) is entry.function


@pytest.mark.parametrize("name", SPECIFIED)
def test_the_signature_is_the_specified_one(name: str) -> None:
    inside = SPECIFIED[name].partition("(")[2].removesuffix(")")
    wanted = [part.strip() for part in inside.split(",") if part.strip()]
    got = []
    for parameter in CATALOGUE[name].parameters:
        text = parameter.name
        if CATALOGUE[name].variadic and parameter is CATALOGUE[name].parameters[-1]:
            text += "..."
        elif parameter.default is not REQUIRED:
            text = f"[{text}]"
        got.append(text)
    plain = [re.sub(r" = [^\]]*", "", part) for part in wanted]
    assert got == plain


@pytest.mark.parametrize("name", SPECIFIED)
def test_a_stated_default_is_the_default(name: str) -> None:
    for optional, default in re.findall(r"\[(\w+) = ([^\]]*)\]", SPECIFIED[name]):
        parameter = next(p for p in CATALOGUE[name].parameters if p.name == optional)
        if default == "for ever":
            assert parameter.default == float("inf")
        elif default.startswith('"'):
            assert parameter.default == default.strip('"')
        elif default == "FALSE":
            assert parameter.default is False
        else:
            assert parameter.default == float(default)


@pytest.mark.parametrize("name", SPECIFIED)
def test_the_docstring_has_its_sections_in_order(name: str) -> None:
    text = every(CATALOGUE[name])
    found = re.findall(rf"^({'|'.join(SECTIONS)}):", text, re.MULTILINE)
    assert found == [section for section in SECTIONS if section in found]
    needed = {"Result", "Example"}
    if CATALOGUE[name].parameters:
        needed |= {"Arguments", "Errors"}
    assert needed <= set(found)
    assert CATALOGUE[name].summary.endswith(".")
    assert len(CATALOGUE[name].summary) <= 250


@pytest.mark.parametrize("name", SPECIFIED)
def test_each_argument_says_its_meaning_and_the_range_that_is_enforced(name: str) -> None:
    for parameter in CATALOGUE[name].parameters:
        meaning, _, stated = parameter.help.partition(";")
        assert meaning, parameter.name
        assert len(parameter.help) <= 250
        enforced = parameter.spec.text or "anything"
        assert " ".join(stated.split()) == enforced, parameter.name


@pytest.mark.parametrize("name", SPECIFIED)
def test_the_example_runs(name: str) -> None:
    kernel = CATALOGUE[name].kernel
    namespace = dict(vars(sys.modules[kernel.__module__]))
    finder = doctest.DocTestFinder(recurse=False)
    runner = doctest.DocTestRunner(verbose=False)
    (example,) = finder.find(kernel, name, globs=namespace, module=False)
    assert example.examples
    report: list[str] = []
    runner.run(example, out=report.append)
    assert not runner.failures, "".join(report)
