"""The procedure: checks that measure and judge, and the sequencer that runs them.

``events``     what a run says while it goes
``clock``      time, handed in
``checks``     supply, identity, carrier, lock
``steps``      bit error steps
``sequencer``  one unit from scan to disposition, with the station safe at every end
"""

from linetest.procedure.clock import Clock, SystemClock
from linetest.procedure.events import (
    CheckStarted,
    Disposition,
    Event,
    InstrumentUsed,
    Judged,
    Judgement,
    ReadingTaken,
    RunEnded,
    RunStarted,
    StepProgress,
    StepStarted,
)
from linetest.procedure.sequencer import Listener, RunOrder, Sequencer, new_run_id, run_unit

__all__ = [
    "CheckStarted",
    "Clock",
    "Disposition",
    "Event",
    "InstrumentUsed",
    "Judged",
    "Judgement",
    "Listener",
    "ReadingTaken",
    "RunEnded",
    "RunOrder",
    "RunStarted",
    "Sequencer",
    "StepProgress",
    "StepStarted",
    "SystemClock",
    "new_run_id",
    "run_unit",
]
