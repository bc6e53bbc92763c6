"""The circuit of `coil`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """A switched coil with its resistance, and a diode with a Zener, or a resistor, across it."""
    d = drawing()
    d += (supply := elm.SourceV().up().length(4.4).label("V_sup"))
    d += elm.Switch().right().length(3).label("switch", loc="top")
    d += (first := elm.Dot())
    d += elm.Line().right().length(3)
    d += (second := elm.Dot())
    d += elm.Line().right().length(3)
    d += elm.ResistorIEC().down().length(2.2).label("R_cu", loc="bottom")
    d += elm.Inductor2().down().length(2.2).label("L_open, L_shut", loc="bottom")
    d += elm.Line().tox(second.center)
    d += (second_foot := elm.Dot())
    d += elm.Line().tox(first.center)
    d += (first_foot := elm.Dot())
    d += elm.Line().tox(supply.start)
    d += elm.Diode().at(first_foot.center).up().length(2.2).label("V_fwd", loc="bottom")
    d += elm.Zener().up().length(2.2).label("V_zen", loc="bottom").reverse()
    d += (
        elm.ResistorIEC()
        .at(second.center)
        .toy(second_foot.center)
        .label("or\nR_sup", loc="bottom", halign="left")
    )
    return d
