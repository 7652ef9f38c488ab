"""The bench: a simulated station with hidden truth, reached through VISA only.

``truth``    what the instruments really do, drawn by seed
``units``    units by serial, and the demo lot
``symbols``  the unit at symbol level: exact error counts, fast
``clock``    time as in life, faster, or virtual
``station``  state and physics around one node
``scpi``     IEEE 488.2 messages and SCPI headers
``devices``  the instruments' commands
``server``   each instrument on a loopback port
``sheet``    the station sheet that belongs to it
"""

from linetest.bench.server import ServedBench, serve
from linetest.bench.sheet import write_station_sheet
from linetest.bench.station import Bench
from linetest.bench.symbols import ErrorProcess, count_by_symbols
from linetest.bench.truth import DataSheet, Truth
from linetest.bench.units import Planted, UnitTruth, demo_lot, model_truth, unit_truth

__all__ = [
    "Bench",
    "DataSheet",
    "ErrorProcess",
    "Planted",
    "ServedBench",
    "Truth",
    "UnitTruth",
    "count_by_symbols",
    "demo_lot",
    "model_truth",
    "serve",
    "unit_truth",
    "write_station_sheet",
]
