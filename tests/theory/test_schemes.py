"""Names of schemes: what can be put together and what cannot."""

from __future__ import annotations

from itertools import product

import pytest

from linetest.errors import ParameterError
from linetest.theory import SCHEMES, bit_error_rate, symbol_error_rate
from linetest.theory.decoder_tables import DECODER_ROWS
from linetest.theory.reed_solomon import OUTER_CODES
from linetest.theory.schemes import find_curve

PLAIN = [
    "bpsk",
    "qpsk",
    "oqpsk",
    "msk",
    "de-bpsk",
    "de-qpsk",
    "dbpsk",
    "dqpsk",
    "pi4-dqpsk",
    "8psk",
    "16qam",
    "fsk-coherent",
    "fsk-noncoherent",
]


def test_every_plain_scheme_is_there_and_decides_symbols() -> None:
    assert [scheme for scheme in SCHEMES if "+" not in scheme] == PLAIN
    for scheme in PLAIN:
        assert 0.0 < symbol_error_rate(scheme, 6.0) < 1.0


def test_antipodal_schemes_take_every_code() -> None:
    inner = ["", *(f"+{code}" for code in DECODER_ROWS)]
    outer = ["", *(f"+{code}" for code in OUTER_CODES)]
    coded = {f"{m}{i}{o}" for m, i, o in product(("bpsk", "qpsk", "oqpsk"), inner, outer)}
    assert {scheme for scheme in SCHEMES if "+" in scheme} == {scheme for scheme in coded if "+" in scheme}


def test_a_code_sees_the_same_channel_on_every_antipodal_scheme() -> None:
    rates = {bit_error_rate(f"{scheme}+conv-1/2+rs-204-188", 3.0) for scheme in ("bpsk", "qpsk", "oqpsk")}
    assert len(rates) == 1


@pytest.mark.parametrize(
    "name",
    ["", "QPSK", "qpsk+", "qpsk+rs-204-188+conv-1/2", "dqpsk+conv-1/2", "qpsk+conv-1/2+conv-1/2", "8psk+rs-204-188"],
)
def test_names_that_mean_nothing_are_refused(name: str) -> None:
    with pytest.raises(ParameterError, match=r"^scheme is '.*', but must be one of bpsk, qpsk.* an outer code or both"):
        find_curve(name)
