"""The circuit of `field-discharge`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """A supply that opens, a dump resistor, and a coil with its resistance."""
    d = drawing()
    d += (supply := elm.SourceV().up().length(4).label("supply"))
    d += elm.Switch(action="open").right().length(3.2).label("opens at t = 0", loc="top")
    d += (top := elm.Dot())
    d += elm.ResistorIEC().down().length(2.4).label("R_dump", loc="bottom")
    d += elm.Diode().down().length(1.6).label("V_arc", loc="bottom").reverse()
    d += (foot := elm.Dot())
    d += elm.Line().at(top.center).right().length(3.4)
    d += elm.ResistorIEC().down().length(2).label("R_coil", loc="bottom")
    d += elm.Inductor2().down().length(2).label("L_coil, I_start", loc="bottom")
    d += elm.Line().tox(foot.center)
    d += elm.Line().tox(supply.start)
    return d
