"""Limit sheets, and the limit of each step with its derivation.

The map, in the order data takes:

- `tables`: what all tables have in common; the mode
- `sheet`: what a sheet holds, frozen, each number with its source
- `crossrules`: rules between tables: names that must meet, curves that must carry the limits
- `load`: files to sheets, all faults at once
- `plans`: plans of steps, designed once for equal content
- `derive`: from sheet, Eb/N0 and its uncertainty to limit, guard bands and plan
- `characteristic`: who will pass, how long it takes, whether the sheet can be met
"""

from linetest.limits.characteristic import derive_all, mean_seconds, passing_probability, plan_faults
from linetest.limits.derive import StepLimit, derive_step
from linetest.limits.load import list_sheets, load_model, load_sheet
from linetest.limits.plans import limit_curve
from linetest.limits.sheet import (
    BerCheck,
    CarrierLimits,
    LimitSheet,
    LockLimits,
    Procedure,
    SupplyLimits,
)
from linetest.limits.tables import Mode

__all__ = [
    "BerCheck",
    "CarrierLimits",
    "LimitSheet",
    "LockLimits",
    "Mode",
    "Procedure",
    "StepLimit",
    "SupplyLimits",
    "derive_all",
    "derive_step",
    "limit_curve",
    "list_sheets",
    "load_model",
    "load_sheet",
    "mean_seconds",
    "passing_probability",
    "plan_faults",
]
