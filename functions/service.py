"""What the add-in says of itself, and why a call gives an error."""

from __future__ import annotations

from importlib.metadata import version as _distribution_version
from typing import Annotated, Any

from tausheet.functions.arguments import Anything, Code, Parameter, Spec, is_blank, single
from tausheet.functions.catalogue import CATALOGUE, cell_function
from tausheet.functions.errors import InputError


@cell_function("FO_VERSION", "Service", texts=True)
def version() -> str:
    """Version of tausheet, as a text.

    Result: the version text, for example 0.1.0.

    Example:
        >>> version().count(".")
        2
    """
    return _distribution_version("tausheet")


@cell_function("FO_REASON", "Service", texts=True)
def reason(cell_function: Code, *arguments: Annotated[Any, Anything()]) -> str:
    """Why a call of a cell function gives an error, in words; an empty text when it does not.

    In a range the first error in reading order is explained.

    Arguments:
        cell_function: name of the cell function, as a text; a text
        arguments: the arguments of the call, in its order; anything

    Result: the sentence, or an empty text.

    Errors: #VALUE! for a name that is no cell function. An error value among the arguments comes
    out unchanged, as from every cell function.

    Example:
        >>> reason("FO_STEP", 1, 0, 0, 5)
        'FO_STEP: tau is 0; allowed: number > 0; enter the time constant (s)'
    """
    for value in (cell_function, *arguments):
        Spec().pass_on(value, Parameter("an argument", Spec(), None, ""))
    name = single(cell_function)
    if is_blank(name):
        raise InputError(
            "FO_REASON: cell_function is blank; enter the name of a cell function as a text"
        )
    entry = CATALOGUE.get(str(name).strip().upper())
    if entry is None:
        raise InputError(
            f'FO_REASON: cell_function is the text "{str(name)[:40]}", which is no cell function; '
            'enter a name such as "FO_STEP"'
        )
    return entry.reason(arguments)
