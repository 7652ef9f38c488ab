"""Instruments: links, dialects, roles and the station sheet. The only room that imports PyVISA.

``sessions``   in process and over a raw socket, with a deadline on everything
``library``    our VISA library, which routes each resource
``translate``  foreign exceptions become ours
``link``       one conversation: lock, deadline, fence, error queue
``dialect``    how one model says the verbs of its role (TOML files in ``dialects/``)
``roles``      what an instrument does for us, with units
``sheet``      the station sheet
``station``    opened, identified, checked, made safe, locked
"""

from linetest.instruments.dialect import ROLES, Dialect, load_dialect
from linetest.instruments.library import SimulatedDevice, StationLibrary
from linetest.instruments.link import Link
from linetest.instruments.roles import (
    Attenuator,
    Counts,
    NoiseSource,
    PowerMeter,
    Supply,
    UnitIdentity,
    UnitPort,
)
from linetest.instruments.sessions import Conversation
from linetest.instruments.sheet import InstrumentEntry, NoiseFacts, StationSheet, load_station_sheet
from linetest.instruments.station import (
    Station,
    StationFinding,
    check_station,
    open_station,
    station_lock,
)

__all__ = [
    "ROLES",
    "Attenuator",
    "Conversation",
    "Counts",
    "Dialect",
    "InstrumentEntry",
    "Link",
    "NoiseFacts",
    "NoiseSource",
    "PowerMeter",
    "SimulatedDevice",
    "Station",
    "StationFinding",
    "StationLibrary",
    "StationSheet",
    "Supply",
    "UnitIdentity",
    "UnitPort",
    "check_station",
    "load_dialect",
    "load_station_sheet",
    "open_station",
    "station_lock",
]
