"""The module that Excel's add-in file names: importing it registers every cell function."""

import xlwings

import tausheet.functions  # noqa: F401 - fills the catalogue
from tausheet.addin.excel.registration import end_when_stuck, register

register(globals(), xlwings)
end_when_stuck()
