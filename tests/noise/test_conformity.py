"""Guard bands and risks against the published examples of JCGM 106 and ILAC-G8."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats

from linetest.errors import ParameterError
from linetest.noise import acceptance_limit_for, global_risks, guard_band, specific_risk

# JCGM 106:2012, 9.5.4: radial error motion of bearings, limit 2 um, u 0.25 um, line Gamma(4, 1/4).
BEARINGS = stats.gamma(4.0, scale=0.25)
LINE = (0.0, 8.0)
LIMIT_UM, U_UM = 2.0, 0.25


def test_bearings_of_jcgm_106_with_simple_acceptance() -> None:
    """JCGM 106:2012, 9.5.4: 4.2 % of the line is beyond; consumer's risk 0.8 %; producer's 1.7 % (from memory)."""
    assert BEARINGS.sf(LIMIT_UM) == pytest.approx(0.042, abs=5e-4)
    risks = global_risks(BEARINGS.pdf, LINE, u=U_UM, upper_limit=LIMIT_UM, acceptance_limit=LIMIT_UM)
    assert risks.consumer == pytest.approx(0.008, abs=5e-4)
    assert risks.producer == pytest.approx(0.017, abs=6e-4)


def test_bearings_of_jcgm_106_with_a_guard_band() -> None:
    """JCGM 106:2012, 9.5.4: a guard band for 0.1 % consumer's risk costs the producer 7.5 % (from memory)."""
    limit = acceptance_limit_for(BEARINGS.pdf, LINE, u=U_UM, upper_limit=LIMIT_UM, most_consumer_risk=0.001)
    risks = global_risks(BEARINGS.pdf, LINE, u=U_UM, upper_limit=LIMIT_UM, acceptance_limit=limit)
    assert limit < LIMIT_UM
    assert risks.consumer == pytest.approx(0.001, abs=1e-6)
    assert risks.producer == pytest.approx(0.075, abs=6e-4)


def test_global_risks_are_what_a_simulated_line_shows() -> None:
    rng = np.random.default_rng(106)
    true = BEARINGS.rvs(1_000_000, random_state=rng)
    shown = true + U_UM * rng.standard_normal(true.size)
    risks = global_risks(BEARINGS.pdf, LINE, u=U_UM, upper_limit=LIMIT_UM, acceptance_limit=1.8)
    consumer = float(np.mean((true > LIMIT_UM) & (shown <= 1.8)))
    producer = float(np.mean((true <= LIMIT_UM) & (shown > 1.8)))
    for simulated, computed in ((consumer, risks.consumer), (producer, risks.producer)):
        assert abs(simulated - computed) < 4.0 * math.sqrt(computed / true.size)


def test_guard_band_of_083_expanded_uncertainties() -> None:
    """ILAC-G8:09/2019, table 1 (from memory): 5 % specific risk needs 1.65 u, printed 0.83 U."""
    assert guard_band(1.0, 0.05) == pytest.approx(1.65, abs=0.006)
    assert guard_band(0.5, 0.05) == pytest.approx(0.83, abs=0.008)
    assert guard_band(0.06, 0.5) == 0.0


def test_guard_band_of_one_expanded_uncertainty() -> None:
    """ILAC-G8:09/2019, 4.2: w = U keeps the specific risk below 2.5 %; w = 0 below 50 %."""
    assert specific_risk(1.0 - 2.0 * 0.1, 0.1, 1.0) == pytest.approx(0.0228, abs=5e-5)
    assert specific_risk(1.0, 0.1, 1.0) == 0.5


def test_guard_band_and_specific_risk_are_inverse() -> None:
    for risk in (1e-6, 0.01, 0.05, 0.4):
        assert specific_risk(5.0 - guard_band(0.3, risk), 0.3, 5.0) == pytest.approx(risk, rel=1e-9)


def test_line_without_bad_items_needs_no_guard_band() -> None:
    good = stats.uniform(0.0, 2.1)
    found = acceptance_limit_for(good.pdf, (0.0, 2.1), u=0.01, upper_limit=2.0, most_consumer_risk=0.2)
    assert found == 2.0


@pytest.mark.parametrize("u", [0.0, -1.0, math.nan, math.inf])
def test_uncertainty_must_be_one(u: float) -> None:
    with pytest.raises(ParameterError, match="but must be finite and above 0"):
        guard_band(u, 0.05)
    with pytest.raises(ParameterError, match="but must be finite and above 0"):
        specific_risk(1.0, u, 2.0)


def test_wrong_input_is_named() -> None:
    with pytest.raises(ParameterError, match=r"most_specific_risk is 0\.6"):
        guard_band(1.0, 0.6)
    with pytest.raises(ParameterError, match=r"upper_limit is 9\.0, but must lie between 0 and 8"):
        global_risks(BEARINGS.pdf, LINE, u=1.0, upper_limit=9.0, acceptance_limit=2.0)
    with pytest.raises(ParameterError, match=r"most_consumer_risk is 0\.0"):
        acceptance_limit_for(BEARINGS.pdf, LINE, u=U_UM, upper_limit=LIMIT_UM, most_consumer_risk=0.0)
