"""Makes the packages of the Python that installed the extension usable in LibreOffice's own."""

from __future__ import annotations

import os
import site
import sys
from collections.abc import Sequence
from typing import Any


def missing(recorded: dict[str, Any]) -> str:
    """A sentence when the recorded Python or a folder of it is gone, else an empty text."""
    for path in (recorded["executable"], *recorded["folders"]):
        if not os.path.exists(path):
            return (
                f"{path} is gone, from which tausheet was installed; "
                "run tausheet install calc again"
            )
    return ""


def add(folders: Sequence[str]) -> None:
    """Add package folders, those that their .pth files name included (editable installations).

    They come before the distribution's own packages, whose numpy may be older.
    """
    before = list(sys.path)
    for folder in folders:
        site.addsitedir(folder)
    new = [path for path in sys.path if path not in before]
    first = next((i for i, path in enumerate(before) if path.endswith("-packages")), len(before))
    sys.path[:] = [*before[:first], *new, *before[first:]]
