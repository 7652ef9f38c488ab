"""What is noted of the instruments that a calibration holds for."""

from __future__ import annotations

from linetest.noise.station import CALIBRATED_ROLES, instruments_of
from tests.noise.fakes import FakeStation


def test_every_instrument_that_touches_the_noise_is_noted_with_its_papers() -> None:
    noted = {entry.role: entry for entry in instruments_of(FakeStation())}
    assert tuple(noted) == CALIBRATED_ROLES
    meter = noted["power_meter"]
    assert (meter.identity, meter.serial) == ("Brackwater,power_meter,7,1.0", "power_meter-7")
    assert (meter.certificate, meter.calibration_due) == ("C-power_meter", "2030-06-30")
    assert noted["noise_source"].calibration_due == ""
    assert len({entry.dialect_digest for entry in noted.values()}) == 3
