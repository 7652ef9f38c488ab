"""The mode: rates that agree, errors that come as the scheme makes them."""

from __future__ import annotations

import pytest
from pydantic import ValidationError

from linetest.limits import Mode
from linetest.limits.tables import named

MODE = {
    "name": "m",
    "scheme": "qpsk",
    "bit_rate_bps": 2.048e6,
    "symbol_rate_bd": 1.024e6,
    "pattern": "prbs23",
    "burst_weights": [[1, 1.0]],
}
MODE_SOURCE = {key: "somewhere" for key in MODE if key != "name"}


def mode(**changes: object) -> Mode:
    return Mode.model_validate({**MODE, "source": MODE_SOURCE, **changes})


@pytest.mark.parametrize(
    ("scheme", "weights", "bit_rate_bps", "symbol_rate_bd"),
    [
        ("bpsk", [[1, 1.0]], 64e3, 64e3),
        ("de-bpsk", [[2, 1.0]], 64e3, 64e3),
        ("qpsk", [[1, 1.0]], 2.048e6, 1.024e6),
        ("qpsk+conv-1/2", [[1, 0.5], [4, 0.5]], 1.024e6, 1.024e6),
        # ETSI EN 300 421: at 27.5 MBd, rate 1/2 and 188/204 carry 25.343 Mbit/s of transport stream (by arithmetic).
        ("qpsk+conv-1/2+rs-204-188", [[1, 0.5], [4, 0.5]], 25.343e6, 27.5e6),
    ],
)
def test_rates_agree_with_modulation_and_coding(
    scheme: str, weights: list[list[float]], bit_rate_bps: float, symbol_rate_bd: float
) -> None:
    assert (
        mode(scheme=scheme, burst_weights=weights, bit_rate_bps=bit_rate_bps, symbol_rate_bd=symbol_rate_bd).scheme
        == scheme
    )


@pytest.mark.parametrize(("symbol_rate_bd", "sound"), [(1_024_200, True), (1_023_800, True), (1_024_300, False)])
def test_rates_may_differ_by_a_thousandth_of_a_db(symbol_rate_bd: float, sound: bool) -> None:
    """0.001 dB is 230 parts in a million: 236 Bd of 1 024 000."""
    if sound:
        assert mode(symbol_rate_bd=symbol_rate_bd).symbol_rate_bd == symbol_rate_bd
    else:
        with pytest.raises(ValidationError, match=r"-0\.001 dB off what modulation and coding give"):
            mode(symbol_rate_bd=symbol_rate_bd)


@pytest.mark.parametrize("scheme", ["de-bpsk", "de-qpsk", "qpsk+conv-1/2"])
def test_scheme_whose_errors_come_in_groups_must_say_so(scheme: str) -> None:
    with pytest.raises(ValidationError, match="never makes single errors only"):
        mode(scheme=scheme)


def test_dispersion_is_second_over_first_moment() -> None:
    assert mode().dispersion == 1.0
    assert mode(burst_weights=[[2, 1.0]]).dispersion == 2.0
    # E[w^2]/E[w] of 1 (share 3/4) and 5 (share 1/4) is 7/2.
    assert mode(burst_weights=[[1, 0.75], [5, 0.25]]).dispersion == pytest.approx(3.5)


def test_entry_of_a_list_goes_by_its_name_or_its_number() -> None:
    assert named([{"name": "a"}, {"name": 3}, 7], 0) == "a"
    assert named([{"name": "a"}, {"name": 3}, 7], 1) == "2"
    assert named([{"name": "a"}], 5) == "6"
    assert named("text", 0) == "1"
