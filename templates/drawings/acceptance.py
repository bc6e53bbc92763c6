"""The circuit of `acceptance`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """An R-C circuit that is switched, with the probe and the instrument beside it."""
    d = drawing()
    d += (source := elm.SourceV().up().length(3.2))
    d += elm.Switch(action="close").right().length(2.2).label("t_switch", loc="top")
    d += elm.ResistorIEC().right().length(2.4).label("R_node")
    d += (node := elm.Dot())
    d += elm.Capacitor().down().toy(source.start).label("tau_design", loc="bottom")
    d += elm.Dot()
    d += elm.Line().at(node.center).right().length(3.4)
    d += (tip := elm.Dot(open=True).label("probe", loc="top"))
    d += elm.ResistorIEC().down().toy(source.start).label("R_probe", loc="bottom")
    d += elm.Dot()
    d += elm.Line().at(tip.center).right().length(2.4)
    d += elm.Capacitor().down().toy(source.start).label("C_probe", loc="bottom")
    d += elm.Line().tox(source.start)
    return d
