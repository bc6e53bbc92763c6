"""The other calc sheets in LibreOffice: demo, random valid and invalid sets."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from random_sets import compare_in_calc

from tausheet import templates
from tausheet.addin import calc

NAMES = tuple(templates.SHEETS)[1::2]
"""Every other sheet: a file's tests stay on one worker, and these take longest of all."""


@pytest.fixture(scope="module")
def office() -> Iterator[calc.Calc]:
    with calc.Calc() as running:
        yield running


@pytest.mark.parametrize("name", NAMES)
def test_random_sets_are_alike(office: calc.Calc, tmp_path: Path, name: str) -> None:
    compare_in_calc(office, tmp_path, name, valid=8, invalid=4, seed=1)


@pytest.mark.campaign
@pytest.mark.parametrize("name", NAMES)
def test_many_random_sets_are_alike(office: calc.Calc, tmp_path: Path, name: str) -> None:
    compare_in_calc(office, tmp_path, name, valid=100, invalid=50, seed=2)
