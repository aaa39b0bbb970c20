"""Compare programs across devices: one plan for each pair, ranked on one scale."""

from placer.compare.rows import Options, Row, fits_somewhere, ranked, row_of
from placer.compare.runs import Job, sweep

__all__ = ["Job", "Options", "Row", "fits_somewhere", "ranked", "row_of", "sweep"]
