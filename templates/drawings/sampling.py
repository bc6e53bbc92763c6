"""The circuit of `sampling`."""

from __future__ import annotations

from typing import Any

from tausheet.templates.drawings import drawing, elm


def draw() -> Any:
    """A source through its resistance and a switch to the sample capacitor, stray at the pin."""
    d = drawing()
    d += (source := elm.SourceV().up().length(2.6).label("signal"))
    d += elm.ResistorIEC().right().length(3).label("R_src")
    d += (pin := elm.Dot())
    d += elm.Capacitor().down().length(2.6).label("C_stray", loc="bottom")
    d += (foot := elm.Dot())
    d += elm.Line().at(pin.center).right().length(1.4)
    d += elm.Switch(action="close").right().length(2.4).label("closes at t = 0", loc="top")
    d += elm.ResistorIEC().right().length(2.6).label("R_sw")
    d += elm.Capacitor().down().length(2.6).label("C_samp", loc="bottom")
    d += elm.Line().tox(foot.center)
    d += elm.Line().tox(source.start)
    return d
