"""Every calc sheet in LibreOffice: demo, random valid and invalid sets, as the embedded engine."""

from __future__ import annotations

import random
from collections.abc import Iterator
from pathlib import Path

import pytest
import random_sets
from filled import Filled, assert_refused, differences

from tausheet import templates
from tausheet.addin import calc


@pytest.fixture(scope="module")
def office() -> Iterator[calc.Calc]:
    with calc.Calc() as running:
        yield running


@pytest.mark.parametrize("name", templates.SHEETS)
def test_random_sets_are_alike(office: calc.Calc, tmp_path: Path, name: str) -> None:
    compare(office, tmp_path, name, valid=20, invalid=10, seed=1)


@pytest.mark.campaign
@pytest.mark.parametrize("name", templates.SHEETS)
def test_many_random_sets_are_alike(office: calc.Calc, tmp_path: Path, name: str) -> None:
    compare(office, tmp_path, name, valid=100, invalid=50, seed=2)


def compare(
    office: calc.Calc, folder: Path, name: str, valid: int, invalid: int, seed: int
) -> None:
    """Every cell of every set in one open document: numbers to 1e-12, all else exactly."""
    draw = random.Random(seed)
    here = Filled.demo(templates.SHEETS[name], folder)
    path = folder / f"{name}.xlsx"
    with office.open(path) as book:
        there = Filled(here.sheet, path, book)
        assert differences(here.put(), there.put()) == []
        sets = []
        for number in range(valid):
            sets.append(cells := random_sets.valid(here, draw))
            random_sets.assert_both_ways_agree(here)
            random_sets.assert_verdict_follows(here)
            assert differences(here, there.put(**cells)) == [], (number, cells)
        for number in range(invalid):
            entry, cells = random_sets.invalid(here, draw.choice(sets), draw)
            assert_refused(here.put(**cells), entry)
            assert differences(here, there.put(**cells)) == [], (number, cells)
