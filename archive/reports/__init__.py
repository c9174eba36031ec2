"""The two reports: the run sheet of a finished cooldown and the methods appendix of a chapter."""

from archive.reports.appendix import methods_appendix
from archive.reports.run_sheet import run_sheet_html, run_sheet_json, run_sheet_pdf
from archive.reports.view import CooldownView

__all__ = ["CooldownView", "methods_appendix", "run_sheet_html", "run_sheet_json", "run_sheet_pdf"]
