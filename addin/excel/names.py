"""Names that a function and its arguments may have in VBA and on a worksheet at once."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence

from tausheet.addin.excel import bridge

# [MS-VBAL] 3.3.5.2, reserved identifiers; case does not count
_RESERVED = """
    Call Case Close Const Declare DefBool DefByte DefCur DefDate DefDbl DefInt DefLng DefLngLng
    DefLngPtr DefObj DefSng DefStr DefVar Dim Do Else ElseIf End EndIf Enum Erase Event Exit For
    Friend Function Get Global GoSub GoTo If Implements Input Let Lock Loop LSet Next On Open
    Option Print Private Public Put RaiseEvent ReDim Resume Return RSet Seek Select Set Static Stop
    Sub Type Unlock Wend While With Write Rem
    Any As ByRef ByVal Each In New Shared Until WithEvents Optional ParamArray Preserve Spc Tab
    Then To AddressOf And Eqv Imp Is Like Mod Not Or TypeOf Xor
    Abs CBool CByte CCur CDate CDbl CDec CInt CLng CLngLng CLngPtr CSng CStr CVar CVErr Date Debug
    DoEvents Fix Int Len LenB Me PSet Scale Sgn String Array Circle InputB LBound UBound
    Boolean Byte Currency Double Integer Long LongLong LongPtr Single Variant
    True False Nothing Empty Null Attribute LineInput CDecl Decimal DefDec
"""
# words with a meaning in some places only: legal, but the editor may recase or misread them
_CONTEXTUAL = """
    Access Alias AppActivate Append Base Beep Begin Binary Class ChDir ChDrive Collection Compare
    Database Error Explicit FileCopy Kill Lib Line Load Mid MkDir Module Name Object Output
    Property PtrSafe Random Randomize Read Reset RmDir SavePicture SaveSetting SendKeys SetAttr
    Step Text Time Unload Version Width
"""
# what the generated wrapper uses inside each function, and the argument that xlwings fills itself
_IN_THE_WRAPPER = """
    Application ActiveWorkbook ThisWorkbook Err Range App argsArray failed k caller
"""
RESERVED = {
    word.casefold(): why
    for words, why in (
        (_RESERVED, "a reserved word of VBA"),
        (_CONTEXTUAL, "a word that VBA reads differently in some places"),
        (f"{_IN_THE_WRAPPER} {' '.join(bridge.OWN_NAMES)}", "used by the generated wrapper"),
    )
    for word in words.split()
}

MOST_ARGUMENTS = 60
LONGEST_DESCRIPTION = 255
LONGEST_ARGUMENT_LIST = 254

_IDENTIFIER = re.compile(r"[A-Za-z][A-Za-z0-9_]{0,254}")
_A1 = re.compile(r"([A-Za-z]{1,3})([0-9]+)")
_R1C1 = re.compile(r"(?i)R[0-9]*C[0-9]*|R[0-9]*|C[0-9]*")


def reads_as_a_cell(name: str) -> bool:
    """Whether a formula would read the name as a cell address."""
    found = _A1.fullmatch(name)
    if found:
        column = 0
        for letter in found[1].upper():
            column = 26 * column + ord(letter) - ord("A") + 1
        if column <= 16384 and 1 <= int(found[2]) <= 1048576:
            return True
    return _R1C1.fullmatch(name) is not None


def problems(
    function: str, arguments: Sequence[str], *, variadic: bool, optional: int
) -> list[str]:
    """What keeps these names out of Excel, in sentences; empty when nothing does."""
    found = []
    for kind, name in [("function", function), *(("argument", name) for name in arguments)]:
        if not _IDENTIFIER.fullmatch(name):
            found.append(f"{kind} {name}: not a VBA identifier")
        elif name.casefold() in RESERVED:
            found.append(f"{kind} {name}: {RESERVED[name.casefold()]}")
    if reads_as_a_cell(function):
        found.append(f"function {function}: reads as a cell address")
    folded = [name.casefold() for name in arguments]
    if len(set(folded)) != len(folded):
        found.append(f"{function}: two arguments differ only by case")
    if function.casefold() in folded:
        found.append(f"{function}: an argument has the function's name")
    if len(arguments) > MOST_ARGUMENTS:
        found.append(
            f"{function}: {len(arguments)} arguments, at most {MOST_ARGUMENTS} are possible"
        )
    if len(", ".join(arguments)) + len(arguments) > LONGEST_ARGUMENT_LIST:
        found.append(f"{function}: the argument names are too long together")
    if variadic and optional:
        found.append(f"{function}: optional arguments cannot go with variable ones")
    return found


def collisions(functions: Iterable[str], modules: Iterable[str]) -> list[str]:
    """Functions that differ only by case, or are named like a module of the add-in."""
    seen = {module.casefold(): f"the module {module}" for module in modules}
    found = []
    for name in functions:
        if name.casefold() in seen:
            found.append(f"{name} collides with {seen[name.casefold()]}")
        seen[name.casefold()] = f"the function {name}"
    return found
