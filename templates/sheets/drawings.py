"""Draws the circuit pictures that ship with the calc sheets.

    python -m tausheet.templates.sheets.drawings

Needs the extra "draw" (schemdraw with matplotlib, which makes the pixels). Every symbol in a
picture is one of the sheet's: a test reads them.
"""

from __future__ import annotations

import io
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import schemdraw
from schemdraw import elements

elm: Any = elements
INK = "#1F2D3A"
HERE = Path(__file__).parent


def _drawing() -> Any:
    drawing = schemdraw.Drawing(show=False)
    drawing.config(unit=2.4, fontsize=12, font="Liberation Sans", lw=1.5, color=INK)
    return drawing


def bleed() -> Any:
    """A bank of two levels with tapped discharge resistors behind a supply that opens."""
    d = _drawing()
    d += (supply := elm.SourceV().up().length(4.8).label("supply"))
    d += (opens := elm.Switch(action="open").right().length(3.2).label("opens at t = 0", loc="top"))
    d += elm.Line().right().length(1.2)
    d += (top := elm.Dot())
    d += elm.Capacitor().down().length(2.4).label("C_unit\nn_p in parallel", loc="bottom")
    d += (middle := elm.Dot())
    d += elm.Capacitor().down().length(2.4).label("C_unit\nn_p in parallel", loc="bottom")
    d += (bottom := elm.Dot())
    d += elm.Line().at(bottom.center).tox(supply.start)
    d += elm.Line().at(top.center).right().length(5.2)
    d += (first := elm.ResistorIEC().down().length(2.4))
    d += (tap := elm.Dot())
    d += elm.ResistorIEC().down().length(2.4)
    d += elm.Line().tox(bottom.center)
    d += elm.Line().at(middle.center).tox(tap.center).label("tapped", loc="top")
    d += (
        elm.Gap()
        .at((first.start[0] + 0.5, first.start[1]))
        .down()
        .length(4.8)
        .label("R_unit\nn_rp chains of\nn_rs in series", loc="bottom", halign="left")
    )
    d += (
        elm.Gap()
        .at((opens.end[0] - 0.4, top.center[1]))
        .down()
        .length(4.8)
        .label(("+", "V_start", "−"))
    )
    d += (
        elm.Gap()
        .at((bottom.center[0] - 0.2, bottom.center[1] - 0.6))
        .right()
        .length(4)
        .label("n_s levels in series")
    )
    return d


DRAWINGS: dict[str, Callable[[], Any]] = {"bleed.png": bleed}
"""Each picture by its file."""


def labels(name: str) -> list[str]:
    """All that a drawing says, line by line."""
    schemdraw.use("svg")
    data: bytes = DRAWINGS[name]().get_imagedata("svg")
    return re.findall(r">([^<>\s][^<>]*)<", data.decode())


def write(name: str, folder: Path = HERE) -> None:
    """Draw one picture and write it as a small grey PNG, which keeps its labels as a comment."""
    from PIL import Image
    from PIL.PngImagePlugin import PngInfo

    kept = PngInfo()
    kept.add_itxt("labels", "|".join(labels(name)))
    schemdraw.use("matplotlib")
    pixels = io.BytesIO()
    DRAWINGS[name]().draw(show=False).getfig().savefig(pixels, format="png", dpi=200)
    image = Image.open(pixels).convert("L")
    inside = image.point(lambda level: 255 if level < 250 else 0).getbbox()
    assert inside is not None, "the drawing is empty"
    image.crop(inside).quantize(16).save(folder / name, optimize=True, pnginfo=kept)


if __name__ == "__main__":
    for each in DRAWINGS:
        write(each)
