"""The circuits of `ripple`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def _drive(d: Any, at: tuple[float, float], name: str) -> Any:
    d += (drive := elm.SourceSquare().at(at).up().length(2.6).label("V_low,\nV_high"))
    d += elm.ResistorIEC().right().length(2.6).label("R_ser")
    d += elm.Gap().at((at[0], at[1] - 0.5)).right().length(4).label(name)
    return drive


def draw() -> Any:
    """The load across a capacitor on the left, in series with an inductor on the right."""
    d = drawing()
    drive = _drive(d, (0, 0), "R-C")
    d += (node := elm.Dot().at((2.6, 2.6)))
    d += elm.Capacitor().down().length(2.6).label("C_out", loc="bottom")
    d += elm.Line().at(node.center).right().length(2.2)
    d += elm.ResistorIEC().down().length(2.6).label("R_load", loc="bottom")
    d += elm.Line().tox(drive.start)
    drive = _drive(d, (9.5, 0), "R-L")
    d += elm.Inductor2().at((12.1, 2.6)).right().length(2.6).label("L_out")
    d += elm.ResistorIEC().down().length(2.6).label("R_load", loc="bottom")
    d += elm.Line().tox(drive.start)
    return d
