"""The pictures of the README, from what the commands themselves make; needs LibreOffice.

.venv/bin/python tests/pictures.py
"""

from __future__ import annotations

import tempfile
from collections.abc import Sequence
from pathlib import Path

import pypdfium2
from PIL import Image, ImageChops

from tausheet.addin import calc
from tausheet.addin.make import make_index, make_sheet

FOLDER = Path(__file__).resolve().parent.parent / "pictures"
SHEETS = ("bleed", "fault")
SCALE = 1.15
"""Pixels a point of paper."""
COLOURS = 48
MARGIN = 12
MOST = 150_000
"""Bytes that a picture may take."""


def main() -> None:
    """Make every picture anew."""
    FOLDER.mkdir(exist_ok=True)
    with tempfile.TemporaryDirectory() as made, calc.Calc() as office:
        folder = Path(made)
        for name in SHEETS:
            path = folder / f"quay-4-{name}.xlsx"
            make_sheet(name, path, {}, demo=True)
            pages = printed(office, path)
            write(name, [pages[0], next(page for page in pages if "8 Curve" in text(page))])
        path = folder / "index.xlsx"
        make_index(path)
        write("index", printed(office, path)[:2])


def printed(office: calc.Calc, path: Path) -> list[pypdfium2.PdfPage]:
    """The pages that LibreOffice prints of a workbook."""
    (out,) = office.pdf([path])
    return list(pypdfium2.PdfDocument(out))


def text(page: pypdfium2.PdfPage) -> str:
    """What a page says."""
    said: str = page.get_textpage().get_text_range()
    return said


def write(name: str, pages: Sequence[pypdfium2.PdfPage]) -> None:
    """Pages side by side, white edges cut away, in few colours."""
    images = [page.render(scale=SCALE).to_pil().convert("RGB") for page in pages]
    whole = Image.new("RGB", (sum(i.width for i in images), images[0].height), "white")
    left = 0
    for image in images:
        whole.paste(image, (left, 0))
        left += image.width
    x, y, right, bottom = ImageChops.invert(whole).getbbox() or (0, 0, *whole.size)
    box = (max(x - MARGIN, 0), max(y - MARGIN, 0), right + MARGIN, bottom + MARGIN)
    out = FOLDER / f"{name}.png"
    whole.crop(box).quantize(COLOURS, Image.Quantize.MAXCOVERAGE).save(out, optimize=True)
    size = out.stat().st_size
    print(f"{out.name}: {size / 1000:.0f} kB")
    if size > MOST:
        raise SystemExit(f"{out.name} takes more than {MOST / 1000:.0f} kB; lower SCALE or COLOURS")


if __name__ == "__main__":
    main()
