"""Decision: plans with exact risks, and what may be said after them.

``outcomes``   exact distribution of where a test stops
``plan``       a plan as a value
``design``     plans whose exact risks meet the sheet; the best fixed test; Wald's bound
``guarded``    plans that keep their risks although Eb/N0 is uncertain
``after``      the interval after a sequential stop
``intervals``  the interval of a fixed count
"""

from linetest.decision.after import median_unbiased_ber, sequential_interval
from linetest.decision.design import design_plan, fixed_test_bits, wald_bound
from linetest.decision.guarded import GuardedPlan, GuardRule, design_guarded_plan
from linetest.decision.intervals import interval
from linetest.decision.outcomes import BurstWeights
from linetest.decision.plan import Outcome, Plan

__all__ = [
    "BurstWeights",
    "GuardRule",
    "GuardedPlan",
    "Outcome",
    "Plan",
    "design_guarded_plan",
    "design_plan",
    "fixed_test_bits",
    "interval",
    "median_unbiased_ber",
    "sequential_interval",
    "wald_bound",
]
