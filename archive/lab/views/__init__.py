"""What the door hands to notebooks and scripts: arrays and results with their units, and lists that show themselves."""

from archive.lab.views.arrays import ArrayView, ReductionView, SweepView
from archive.lab.views.column import Column
from archive.lab.views.result import Result
from archive.lab.views.rows import RowList

__all__ = ["ArrayView", "Column", "ReductionView", "Result", "RowList", "SweepView"]
