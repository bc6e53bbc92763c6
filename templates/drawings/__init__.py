"""The circuit pictures that ship with the calc sheets: one module a sheet, each with `draw()`.

    python -m tausheet.templates.drawings [NAME ...]

writes them beside the sheets' modules. Needs the extra "draw" (schemdraw with matplotlib, which
makes the pixels). Every symbol in a picture is one of the sheet's: a test reads them.
"""

from __future__ import annotations

import io
import re
from importlib import import_module
from pathlib import Path
from typing import Any

import schemdraw
from schemdraw import elements

elm: Any = elements
INK = "#1F2D3A"
HERE = Path(__file__).parent.parent / "sheets"


def drawing() -> Any:
    """An empty drawing in the style of the house."""
    drawn = schemdraw.Drawing(show=False)
    drawn.config(unit=2.4, fontsize=12, font="Liberation Sans", lw=1.5, color=INK)
    return drawn


def _drawn(file: str) -> Any:
    return import_module(f"tausheet.templates.drawings.{Path(file).stem}").draw()


def labels(file: str) -> list[str]:
    """All that a picture says, line by line."""
    schemdraw.use("svg")
    data: bytes = _drawn(file).get_imagedata("svg")
    return re.findall(r">([^<>\s][^<>]*)<", data.decode())


def write(file: str, folder: Path = HERE) -> None:
    """Draw one picture and write it as a small grey PNG, which keeps its labels as a comment."""
    from PIL import Image
    from PIL.PngImagePlugin import PngInfo

    kept = PngInfo()
    kept.add_itxt("labels", "|".join(labels(file)))
    schemdraw.use("matplotlib")
    pixels = io.BytesIO()
    figure = _drawn(file).draw(show=False).getfig()
    figure.savefig(pixels, format="png", dpi=200, bbox_inches="tight")
    image = Image.open(pixels).convert("L")
    inside = image.point(lambda level: 255 if level < 250 else 0).getbbox()
    assert inside is not None, "the drawing is empty"
    image.crop(inside).quantize(16).save(folder / file, optimize=True, pnginfo=kept)
