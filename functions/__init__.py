"""The arithmetic of tausheet: plain array functions that are also cell functions."""

from tausheet.functions.response import step
from tausheet.functions.service import reason, version

__all__ = ["reason", "step", "version"]
