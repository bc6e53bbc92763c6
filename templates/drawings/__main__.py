"""Writes the pictures of the sheets named, or of every sheet."""

from __future__ import annotations

import sys

from tausheet.templates.drawings import write
from tausheet.templates.sheets import SHEETS

for name in sys.argv[1:] or SHEETS:
    write(SHEETS[name].picture.file)
