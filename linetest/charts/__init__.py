"""Charts: numbers in, small self-contained SVG out, without script and without outside references.

``text``    what makes any text safe and readable; numbers as text
``scales``  where a value lies; ticks and decades
``style``   colours for screen light, screen dark and paper
``frame``   the outer element, its text alternative, shared marks
``ber``     bit error rate against Eb/N0
``yields``  shares with exact intervals
``bars``    uncertainty contributions, causes of rejects

A page that holds charts puts `CHART_STYLE` into its style once; a file of its own is drawn with ``standalone=True``.
"""

from linetest.charts.bars import bar_chart, contributions_chart
from linetest.charts.ber import BerCurve, BerPoint, ber_chart, ber_range_db, theory_curve
from linetest.charts.style import CHART_STYLE
from linetest.charts.text import escaped, visible
from linetest.charts.yields import YieldRow, yield_chart

__all__ = [
    "CHART_STYLE",
    "BerCurve",
    "BerPoint",
    "YieldRow",
    "bar_chart",
    "ber_chart",
    "ber_range_db",
    "contributions_chart",
    "escaped",
    "theory_curve",
    "visible",
    "yield_chart",
]
