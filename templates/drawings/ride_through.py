"""The circuit of `ride-through`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """A capacitor behind a diode and a supply that fails, feeding the load through R_ser."""
    d = drawing()
    d += (supply := elm.SourceV().up().length(3.2).label("supply"))
    d += elm.Switch(action="open").right().length(2.6).label("fails at t = 0", loc="top")
    d += elm.Diode().right().length(1.8)
    d += (top := elm.Dot())
    d += elm.ResistorIEC().down().length(1.6).label("R_ser", loc="bottom")
    d += elm.Capacitor().down().length(1.6).label("C_nom\nfrom V_from", loc="bottom")
    d += (bottom := elm.Dot())
    d += elm.Line().at(bottom.center).tox(supply.start)
    d += elm.Line().at(top.center).right().length(4.4)
    d += (feed := elm.Dot(open=True))
    d += elm.Line().right().length(1.6)
    d += (box := elm.RBox().down().length(3.2))
    d += elm.Line().left().length(1.6)
    d += (back := elm.Dot(open=True))
    d += elm.Line().tox(bottom.center)
    d += (
        elm.Gap()
        .at((box.start[0] + 0.5, box.start[1]))
        .toy(back.center)
        .label("load:\nP_load / eta,\nI_load or R_load", loc="bottom", halign="left")
    )
    d += elm.Gap().at(feed.center).toy(back.center).label(("+", "to V_min", "−"))
    return d
