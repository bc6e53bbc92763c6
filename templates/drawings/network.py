"""The circuit of `network`: the demo's, as an example of what a table holds."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """Nodes, elements between them, a switch that acts at t = 0, the quantity looked at."""
    d = drawing()
    d += (source := elm.SourceV().up().length(3.4).label("source, k_S"))
    d += (left := elm.Dot())
    d += elm.Switch(action="open").right().length(2.8).label("t = 0", loc="top")
    d += (middle := elm.Dot().label("node", loc="top"))
    d += elm.Line().at(left.center).down().length(1.1)
    d += elm.ResistorIEC().right().length(2.8)
    d += elm.Line().toy(middle.center)
    d += elm.Line().at(middle.center).right().length(1.2)
    d += (top := elm.Dot())
    d += elm.ResistorIEC().down().toy(source.start).label("resistor,\nk_R", loc="bottom")
    d += elm.Dot()
    d += elm.Line().at(top.center).right().length(3.0)
    d += (last := elm.Dot())
    d += elm.Inductor2(loops=3).down().toy(source.start).label("store,\nk_X", loc="bottom")
    d += (ground := elm.Dot().label("ground", loc="bottom"))
    d += elm.Line().tox(source.start)
    d += (
        elm.Gap()
        .at((last.center[0] + 1.9, last.center[1]))
        .down()
        .toy(ground.center)
        .label(("+", "y_ask", "−"))
    )
    return d
