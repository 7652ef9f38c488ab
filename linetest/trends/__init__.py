"""Trends: what the line does. Reads records only.

``first_pass``  first-pass yield with exact intervals, rejects and VOID runs by cause
``page``        the page of it
"""

from linetest.trends.first_pass import YieldReport, YieldRow, first_pass_yield, yield_as_dict
from linetest.trends.page import render_yield_page

__all__ = ["YieldReport", "YieldRow", "first_pass_yield", "render_yield_page", "yield_as_dict"]
