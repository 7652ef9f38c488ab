"""linetest: end-of-line test of modem units.

The rooms of the house, and the one way the arrows point. A room imports only from rooms above it; a test of
the suite says so::

    errors        one error root; facts, a sentence, an exit code
    units         dB and ratio, dBm and W, C/N0, Eb/N0, Es/N0
    settings      where things are: database, folders, station sheet
    theory        pure: error rates of modulations and codes, and their inverses
    patterns      pure: test patterns and error counting
    decision      pure: plans with exact risks, intervals, guard bands
    limits        limit sheet -> frozen limits, with their derivation
    instruments   links, dialects, roles, station sheet; the only room that imports pyvisa
    noise         noise calibration, uncertainty budget, setting Eb/N0
    procedure     checks (measure and judge) and the sequencer that yields events
    records       what is kept of every run
    charts        pure: numbers -> SVG
    certificates  record -> HTML                        (reads records only)
    trends        records -> yield and its page         (reads records only)
    cli           parses, calls, prints

    bench         stands aside: simulated instruments and units, reached through VISA only

One unit's way through the house::

    limit sheet ─► procedure ─┐
    station sheet ─► links ─► roles ─► noise ─► sequencer ─► events ─► records ─► certificate, trends
                                                                  └──► screen
"""

__version__ = "0.1.0"
