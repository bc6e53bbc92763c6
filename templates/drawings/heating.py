"""The thermal circuit of `heating`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def _body(d: Any, resistance: str, tau: str, length: float) -> None:
    d += (top := elm.Dot())
    d += elm.ResistorIEC().right().length(length).label(resistance, loc="top")
    d += (end := elm.Dot())
    d += elm.Line().at(top.center).down().length(1.3)
    d += elm.Capacitor().right().length(length).label(tau, loc="bottom")
    d += elm.Line().up().length(1.3)
    d += elm.Line().at(end.center).right().length(0.8)


def draw() -> Any:
    """Power into two thermal bodies in series, down to ambient."""
    d = drawing()
    d += (power := elm.SourceI().up().length(2.8).label("P_on, P_off"))
    d += elm.Line().right().length(1.2)
    _body(d, "R_one", "tau_one", 2.8)
    _body(d, "R_two", "tau_two", 2.8)
    d += elm.SourceV().down().length(2.8).label("T_amb", loc="bottom").reverse()
    d += elm.Line().tox(power.start)
    return d
