"""The calc sheet `heating`: cycle by cycle against stepping, its worst case, its warnings."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator
from typing import Any

import pytest
from filled import Filled

from tausheet import templates

SHEET = templates.SHEETS["heating"]
BODIES = ((0.04, 180.0), (0.012, 1500.0))


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Filled:
    return Filled.demo(SHEET, tmp_path_factory.mktemp("heating"))


def cycles(
    bodies: tuple[tuple[float, float], ...], on: float, off: float, t_on: float, t_off: float
) -> Iterator[tuple[float, float]]:
    """Rise at the end of each on-time and off-time from cold, one interval after the other."""
    rises = [0.0] * len(bodies)
    while True:
        ends = []
        for power, time in ((on, t_on), (off, t_off)):
            for i, (resistance, tau) in enumerate(bodies):
                final = resistance * power
                rises[i] = final + (rises[i] - final) * math.exp(-time / tau)
            ends.append(sum(rises))
        yield ends[0], ends[1]


def settled(*arguments: Any) -> tuple[float, float]:
    return next(itertools.islice(cycles(*arguments), 2000, None))


def test_every_cycle_against_stepping(demo: Filled) -> None:
    demo.put()
    stepped = list(itertools.islice(cycles(BODIES, 30e3, 0.0, 12.0, 108.0), 50))
    for n in (1, 2, 3, 5, 10, 20, 50):
        assert demo[f"T_end_{n}"] == pytest.approx(25 + stepped[n - 1][0], rel=1e-12)
    high, low = settled(BODIES, 30e3, 0.0, 12.0, 108.0)
    assert demo["T_max"] == pytest.approx(25 + high, rel=1e-12)
    assert demo["T_min"] == pytest.approx(25 + low, rel=1e-12)
    assert demo["T_mean"] == pytest.approx(25 + 3000 * 0.052, rel=1e-14)
    assert (demo["verdict"], demo["check_temperature"]) == ("PASS", "PASS")


def test_a_motor_on_one_body_with_losses_in_the_pause(demo: Filled) -> None:
    demo.put(value_of_bodies="one", value_of_P_off=500)
    high, low = settled(BODIES[:1], 30e3, 500.0, 12.0, 108.0)
    assert demo["T_max"] == pytest.approx(25 + high, rel=1e-12)
    assert demo["T_min"] == pytest.approx(25 + low, rel=1e-12)
    assert "one_body_only" in demo.warnings()


def test_worst_case_against_brute_force(demo: Filled) -> None:
    demo.put()
    found = max(
        45 + settled(((r, one), (0.012, two)), p, 0.0, on, off)[0]
        for p, r, one, two, on, off in itertools.product(
            (27e3, 33e3),
            (0.036, 0.044),
            (153.0, 207.0),
            (1275.0, 1725.0),
            (10.8, 13.2),
            (97.2, 118.8),
        )
    )
    assert demo["T_max_max"] == pytest.approx(found, rel=1e-12)


@pytest.mark.parametrize("spread", [15, 50])
@pytest.mark.parametrize("bodies", ["one", "two"])
def test_cycles_to_settle_are_enough_in_every_corner(
    demo: Filled, bodies: str, spread: int
) -> None:
    """Stepped: from that cycle on, the peaks are within dT_ok of what that corner settles at."""
    demo.put(value_of_bodies=bodies, lowest_of_tau_one=-spread, highest_of_tau_one=spread)
    cycle = int(demo["n_settle"])
    assert demo["t_settle"] / (10.8 + 97.2) <= cycle - 1 < demo["t_settle"] / (10.8 + 97.2) + 1
    for one, two, on, off in itertools.product(
        (180 - 1.8 * spread, 180 + 1.8 * spread), (1275.0, 1725.0), (10.8, 13.2), (97.2, 118.8)
    ):
        both = ((0.044, one), (0.012, two))[: 1 if bodies == "one" else 2]
        stepped = [high for high, _ in itertools.islice(cycles(both, 33e3, 0.0, on, off), 600)]
        assert stepped[cycle - 1] >= stepped[-1] - 2
        assert stepped[-1] - stepped[0] < demo["T_avg"] - 45  # the bound it stands on


@pytest.mark.parametrize(
    ("cells", "warning"),
    [
        ({"value_of_t_on": 400, "value_of_t_off": 4000}, "first_cycles_above_the_mean"),
        ({}, "peaks_far_above_the_mean"),
        ({"highest_of_T_amb": 25}, "ambient_without_a_highest"),
        ({"value_of_bodies": "one"}, "one_body_only"),
        ({}, "hot_surface"),
    ],
)
def test_hazards_have_their_warning(demo: Filled, cells: dict[str, Any], warning: str) -> None:
    assert warning in demo.put(**cells).warnings()


def test_short_cycles_at_low_power_give_no_warning(demo: Filled) -> None:
    quiet = {"value_of_t_on": 1.2, "value_of_t_off": 10.8, "value_of_P_on": 1}
    demo.put(**quiet)
    assert demo.warnings() == set()
    assert demo["T_one"] < demo["T_avg"]


@pytest.mark.parametrize(
    "cells",
    [{"value_of_T_lim": 327}, {"highest_of_T_amb": 70}, {"highest_of_P_on": 30}],
    ids=["limit", "ambient at its highest", "power"],
)
def test_the_check_fails_above_the_limit(demo: Filled, cells: dict[str, Any]) -> None:
    demo.put(**cells)
    assert (demo["check_temperature"], demo["verdict"]) == ("FAIL", "FAIL")
    assert demo["check_agreement"] == "PASS"
