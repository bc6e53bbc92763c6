"""The names by which LibreOffice knows the add-in.

A cell function is the method of its own name, FO_STEP, of one service. Release 7.4 writes the
two together, in capitals, into an .xlsx: ORG.TAUSHEET.FUNCTIONS.FO_STEP(
"""

from __future__ import annotations

IDENTIFIER = "org.tausheet.calc"
"""The extension."""

SERVICE = "org.tausheet.Functions"
INTERFACE = "org.tausheet.XFunctions"
JOB = "org.tausheet.LoadJob"
READER = "org.tausheet.Reader"

STORED_PREFIX = SERVICE.upper() + "."
"""What 7.4 puts before the cell name of a formula when it saves an .xlsx."""
