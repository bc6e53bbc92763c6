"""The circuit of `precharge`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """A supply that charges a bank through a resistor, with a bypass over it and a load."""
    d = drawing()
    d += (supply := elm.SourceV().up().length(3.2).label("V_in"))
    d += elm.Switch(action="close").right().length(2.6).label("closes at t = 0", loc="top")
    d += (left := elm.Dot())
    d += elm.ResistorIEC().right().length(3).label("R_pre", loc="bottom")
    d += (right := elm.Dot())
    d += elm.Line().at(left.center).up().length(1.3)
    d += elm.Switch(action="close").right().length(3).label("closes at V_close", loc="top")
    d += elm.Line().down().length(1.3)
    d += elm.ResistorIEC().at(right.center).right().length(2.4).label("R_path", loc="top")
    d += (top := elm.Dot())
    d += elm.Capacitor().down().length(3.2).label("C_bank", loc="bottom")
    d += (bottom := elm.Dot())
    d += elm.Line().at(bottom.center).tox(supply.start)
    d += elm.Line().at(top.center).right().length(2.2)
    d += (across := elm.Dot())
    d += elm.ResistorIEC().down().length(3.2).label("R_par", loc="bottom")
    d += elm.Dot()
    d += elm.Line().tox(bottom.center)
    d += elm.Line().at(across.center).right().length(2.2)
    d += elm.SourceI().down().length(3.2).label("I_load", loc="bottom")
    d += elm.Line().tox(bottom.center)
    return d
