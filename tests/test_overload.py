"""Trip times against mpmath at 100 digits, the response itself, and published classes."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tausheet.functions import step, trip_time
from tausheet.functions.errors import NotAvailable


@pytest.fixture(autouse=True, scope="module")
def digits() -> Iterator[None]:
    """Digits of the references, set back afterwards since mpmath keeps them globally."""
    with mp.workdps(100):
        yield


def exact(pickup: float, tau: float, prior: float, current: float) -> Any:
    # IEC 60255-149, hot curve (from memory; its equation number not confirmed)
    k, p, i = map(mp.mpf, (pickup, prior, current))
    return tau * mp.log((i**2 - p**2) / (i**2 - k**2))


@given(
    st.floats(1e-3, 1e6),
    st.floats(1e-3, 1e6),
    st.one_of(st.just(0.0), st.floats(-14, -0.01).map(lambda e: 1 - 10.0**e)),
    st.floats(-14, 12).map(lambda e: 1 + 10.0**e),
)
def test_cold_and_hot_curves(pickup: float, tau: float, before: float, times: float) -> None:
    prior, current = pickup * before, pickup * times
    if prior < pickup < current:
        time = trip_time(pickup, tau, prior, current)
        expected = exact(pickup, tau, prior, current)
        assert abs(mp.mpf(time) - expected) <= 1e-15 * expected


@given(st.floats(0, 0.99), st.floats(1.01, 10))
def test_at_the_trip_time_the_heat_is_at_the_limit(prior: float, current: float) -> None:
    time = trip_time(1.0, 600.0, prior, current)
    assert step(time, 600.0, prior**2, current**2) == pytest.approx(1.0, rel=1e-12)


@pytest.mark.parametrize("prior", [100.0, 100.1, 1e9])
@pytest.mark.parametrize("current", [0.0, 50.0, 100.0, 400.0])
def test_what_was_above_pickup_before_has_tripped_already(prior: float, current: float) -> None:
    assert trip_time(100.0, 600.0, prior, current) == 0.0


@pytest.mark.parametrize("current", [0.0, 99.9, 100.0])
def test_at_or_below_pickup_it_never_trips(current: float) -> None:
    with pytest.raises(NotAvailable, match=r"current is .*, which does not exceed pickup, 100"):
        trip_time(100.0, 600.0, 20.0, current)


def test_a_column_of_currents() -> None:
    times = trip_time(100.0, 600.0, 0.0, np.array([90.0, 150.0, 720.0]))
    assert np.isnan(times[0])
    assert times[1] == trip_time(100.0, 600.0, 0.0, 150.0)
    assert times[2] == trip_time(100.0, 600.0, 0.0, 720.0)


# IEC 60947-4-1, from memory: at 7.2 x the setting from cold, class 10 trips in 4 to 10 s, 20 in
# 6 to 20 s, 30 in 9 to 30 s; at 1.5 x the setting, warm from the setting itself, within 4, 8 and
# 12 minutes
@pytest.mark.parametrize(("shortest", "longest", "minutes"), [(4, 10, 4), (6, 20, 8), (9, 30, 12)])
def test_one_time_constant_meets_both_limits_of_a_trip_class(
    shortest: float, longest: float, minutes: float
) -> None:
    pickup = 1.12
    # about I^2 t = constant at 7.2 x: tau = t (7.2 / pickup)^2, to 2 %
    tau = 0.98 * longest * (7.2 / pickup) ** 2
    assert shortest < trip_time(pickup, tau, 0.0, 7.2) < longest
    assert longest < trip_time(pickup, tau, 1.0, 1.5) < 60 * minutes
