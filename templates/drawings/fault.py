"""The circuit of `fault`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """One phase of the network, the breaker, motors beside it, and the fault."""
    d = drawing()
    d += (supply := elm.SourceSin().up().length(3.4).label("c_max\nU_net\nf_net"))
    d += elm.ResistorIEC().right().length(2.6).label("R_20\nT_cond", loc="top")
    d += elm.Inductor2(loops=3).right().length(2.6).label("X_net", loc="top")
    d += (bus := elm.Dot())
    d += elm.Switch().right().length(2.8).label("t_part", loc="top")
    d += elm.Line().right().length(0.8)
    d += (
        fault := elm.Switch(action="close").down().length(3.4).label("fault\nat t = 0", loc="top")
    )
    d += elm.Line().at(fault.end).tox(supply.start)
    d += elm.Line().at(bus.center).down().length(0.4)
    d += elm.Motor().down().length(2.2).label("I_mot\nrx_mot", loc="bottom")
    d += elm.Line().down().toy(supply.start)
    d += elm.Dot()
    return d
