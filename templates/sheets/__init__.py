"""One module a calc sheet, and the list of them."""

from __future__ import annotations

from tausheet.templates.model import Sheet
from tausheet.templates.sheets import (
    acceptance,
    bleed,
    coil,
    delay,
    fault,
    field_discharge,
    filter,
    heating,
    network,
    overload,
    precharge,
    ride_through,
    ripple,
    sampling,
    sequence,
)

SHEETS: dict[str, Sheet] = {
    sheet.name: sheet
    for sheet in (
        bleed.SHEET,
        precharge.SHEET,
        delay.SHEET,
        coil.SHEET,
        filter.SHEET,
        sampling.SHEET,
        ripple.SHEET,
        ride_through.SHEET,
        fault.SHEET,
        field_discharge.SHEET,
        overload.SHEET,
        heating.SHEET,
        acceptance.SHEET,
        network.SHEET,
        sequence.SHEET,
    )
}
"""Every calc sheet by its name."""
