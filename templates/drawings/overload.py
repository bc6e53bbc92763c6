"""The circuit of `overload`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """Motor behind its contactor and relay, and the thermal body that the relay models."""
    d = drawing()
    d += elm.Dot(open=True).label("mains", loc="top")
    d += elm.Switch().right().length(2.4).label("trips", loc="top")
    d += elm.RBox().right().length(2.4).label("relay\nI_set, k_pick", loc="top")
    d += elm.Line().right().length(0.6).label("I_act", loc="bottom")
    d += elm.Motor().right().length(2.0).label("I_rated", loc="top")
    d += elm.Gap().right().length(0.8)
    d += (heat := elm.SourceI().up().length(2.6).label("heat by\ncurrent\nsquared", loc="bottom"))
    d += elm.Line().right().length(2.6)
    d += (top := elm.Dot())
    d += elm.Capacitor().down().length(2.6)
    d += (low := elm.Dot())
    d += elm.Line().at(top.center).right().length(1.6)
    d += (
        elm.ResistorIEC()
        .down()
        .length(2.6)
        .label("tau_heat,\nat rest\ntau_cool", loc="bottom", halign="left")
    )
    d += (end := elm.Line().tox(low.center))
    d += elm.Line().tox(heat.start).label("T_amb", loc="bottom")
    d += elm.Gap().at(end.start).right().length(1.6)
    return d
