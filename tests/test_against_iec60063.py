"""Preferred numbers against the series of IEC 60063 (tests/references/iec60063-series.txt)."""

from __future__ import annotations

from pathlib import Path

import pytest

from tausheet.functions import preferred


def published() -> dict[str, list[int]]:
    series: dict[str, list[int]] = {}
    path = Path(__file__).parent / "references" / "iec60063-series.txt"
    for line in path.read_text().splitlines():
        if not line.startswith("#"):
            name, numbers = line.split(":")
            series.setdefault(name, []).extend(map(int, numbers.split()))
    return series


def ours(series: str) -> list[int]:
    """All numbers of a decade, by asking for the next above each in turn."""
    numbers = [100]
    while (number := round(preferred(numbers[-1] + 0.1, series, "up"))) < 1000:
        numbers.append(number)
    return numbers


@pytest.mark.parametrize(("series", "numbers"), published().items())
def test_a_decade_is_the_published_one(series: str, numbers: list[int]) -> None:
    scale = 10 if numbers[0] == 10 else 1
    assert ours(series) == [number * scale for number in numbers]
    assert len(numbers) == int(series[1:])


def test_e192_holds_e96_and_920() -> None:
    e192 = ours("E192")
    assert len(e192) == 192
    assert e192[::2] == published()["E96"]
    assert 920 in e192
    assert 919 not in e192
    # apart from 920, each is the rounded power
    rounded = [round(100 * 10 ** (i / 192)) for i in range(192)]
    assert [(a, b) for a, b in zip(e192, rounded, strict=True) if a != b] == [(920, 919)]


def test_e24_departs_from_rounding_where_the_standard_does() -> None:
    rounded = [round(10 * 10 ** (i / 24)) * 10 for i in range(24)]
    departures = [a for a, b in zip(ours("E24"), rounded, strict=True) if a != b]
    assert departures == [270, 300, 330, 360, 390, 430, 470, 820]
