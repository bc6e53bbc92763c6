"""Ends the report with what each benchmark says of itself: its ratio, and to which baseline."""

from __future__ import annotations

import pytest


def pytest_terminal_summary(
    terminalreporter: pytest.TerminalReporter, config: pytest.Config
) -> None:
    session = getattr(config, "_benchmarksession", None)
    if session is None or not session.benchmarks:
        return
    terminalreporter.section("ratios")
    for bench in session.benchmarks:
        facts = "; ".join(f"{key}: {value}" for key, value in bench.extra_info.items() if value)
        terminalreporter.write_line(f"{bench.name}: {facts}")
