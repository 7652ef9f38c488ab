"""Records: what is kept of every run.

``tables``      the tables
``migrations``  how a database comes to have them
``store``       opens, keeps each event durably, closes what a dead program left open
``reader``      hands runs back as values
``document``    those values
"""

from linetest.records.document import (
    CalibrationRecord,
    InstrumentRecord,
    JudgementRecord,
    ReadingRecord,
    RunRecord,
    RunSummary,
    StepCountRecord,
    run_as_dict,
)
from linetest.records.reader import run_summaries, runs_of
from linetest.records.store import Store

__all__ = [
    "CalibrationRecord",
    "InstrumentRecord",
    "JudgementRecord",
    "ReadingRecord",
    "RunRecord",
    "RunSummary",
    "StepCountRecord",
    "Store",
    "run_as_dict",
    "run_summaries",
    "runs_of",
]
