"""The module that Excel's add-in file names: importing it registers every cell function."""

import xlwings

import tausheet.functions  # noqa: F401 - fills the catalogue
from tausheet.addin.excel.registration import register

register(globals(), xlwings)
