"""What a calc sheet says of itself: inputs, checks, sign-off, version."""

from __future__ import annotations

from collections.abc import Iterator

from tausheet.addin.review import fingerprint
from tausheet.addin.review.finding import Finding
from tausheet.addin.review.workbook_file import WorkbookFile, shown
from tausheet.functions import version

ROLES = ("prepared", "checked", "approved")
SIGNED_BY_STATUS = {"checked": ROLES[:2], "approved": ROLES}
"""Which blocks a sheet of this status must have signed; a draft needs none."""
PARTS = ("by", "on", "signature")


def findings(file: WorkbookFile) -> Iterator[Finding]:
    """Inputs at fault, failing checks, warnings, unsigned blocks, version, fingerprint."""
    yield from _inputs(file)
    yield from _checks(file)
    yield from _signatures(file)
    yield from _version(file)
    yield from _fingerprint(file)


def _inputs(file: WorkbookFile) -> Iterator[Finding]:
    symbols, states, faults = (
        file.values_named(name) for name in ("input_symbols", "input_states", "input_faults")
    )
    for symbol, state, fault in zip(symbols, states, faults, strict=False):
        if state == 0 and fault == 0:
            continue
        places = file.cells_named(f"value_of_{symbol}") or file.cells_named(f"remark_on_{symbol}")
        where = "!".join(places[0]) if places else str(symbol)
        remark = next(iter(file.values_named(f"remark_on_{symbol}")), None)
        found = file.stored_value(*places[0]) if places else None
        yield Finding("missing input", where, f"{symbol}: {shown(found)}", shown(remark, 200))


def _checks(file: WorkbookFile) -> Iterator[Finding]:
    columns = [f"check_{part}" for part in ("names", "values", "limits")]
    places = file.cells_named("check_results")
    rows = zip(places, *(file.values_named(name) for name in columns), strict=False)
    for place, name, value, limit in rows:
        result = file.value(*place)
        if name is not None and result != "PASS":
            found = f"{name}: {shown(value)}, {shown(result)}"
            yield Finding("failing check", "!".join(place), found, shown(limit))
    for place in file.cells_named("verdict"):
        verdict = file.value(*place)
        if verdict != "PASS":
            yield Finding("failing check", "!".join(place), f"verdict: {shown(verdict)}", "PASS")
    for place in file.cells_named("warnings_named"):
        named = file.value(*place)
        if named != "none":
            yield Finding("warning", "!".join(place), shown(named, 200), "none", counts=False)


def _signatures(file: WorkbookFile) -> Iterator[Finding]:
    status = next(iter(file.values_named("status")), None)
    needed = SIGNED_BY_STATUS.get(str(status), ())
    for role in ROLES:
        for part in PARTS:
            places = file.cells_named(f"{role}_{part}")
            if places and str(file.value(*places[0]) or "").strip():
                continue
            where = "!".join(places[0]) if places else f"{role}_{part}"
            expected = f'status "{status}" needs it' if role in needed else "to be filled in"
            yield Finding(
                "unsigned", where, f"{role}, {part}: (blank)", expected, counts=role in needed
            )
            break


def _version(file: WorkbookFile) -> Iterator[Finding]:
    for place in file.cells_named("made_with"):
        made, here = file.value(*place), f"tausheet {version()}"
        if made != here:
            yield Finding("version", "!".join(place), shown(made), f"{here}, which is installed")


def _fingerprint(file: WorkbookFile) -> Iterator[Finding]:
    if fingerprint.is_sealed(file.workbook):
        for departure in fingerprint.departures(file.workbook, file.computed):
            yield Finding("broken fingerprint", departure.cell, departure.found, departure.sealed)
    else:
        places = fingerprint.places_of(file.workbook, "fingerprint")
        where = "!".join(places[0]) if places else "fingerprint"
        found = shown(fingerprint.written(file.workbook) or None)
        yield Finding("not sealed", where, found, "`tausheet seal` writes it", counts=False)
