"""What every test shares: the option for the longer campaigns."""

from __future__ import annotations

import hypothesis
import pytest

# the same cases in each run, and no failure because the machine was busy
hypothesis.settings.register_profile("tausheet", deadline=None, derandomize=True)
hypothesis.settings.load_profile("tausheet")


def pytest_addoption(parser: pytest.Parser) -> None:
    parser.addoption(
        "--campaign", action="store_true", help="also run the campaigns, which take much longer"
    )


def pytest_collection_modifyitems(config: pytest.Config, items: list[pytest.Item]) -> None:
    """A campaign is deselected, and counted as such, unless it is asked for."""
    if config.getoption("--campaign"):
        return
    left_out = [item for item in items if item.get_closest_marker("campaign")]
    if left_out:
        config.hook.pytest_deselected(items=left_out)
        items[:] = [item for item in items if not item.get_closest_marker("campaign")]
