"""Error rates of modulations and codes in white Gaussian noise, and their inverses.

Pure: arrays in, arrays out. The map, in the order data takes:

- `gaussian`: the Gaussian tail; how scalars, arrays and dB pass through
- `uncoded`: closed forms and closed inverses of uncoded schemes
- `phase`: exact phase-shift keying: 8PSK, DQPSK
- `convolutional`: distance spectra and the union bounds
- `decoder_tables`: simulated error rates after the decoder
- `coded`: both joined into one curve a code
- `reed_solomon`: outer codes
- `viterbi`: the decoder simulated, many frames side by side
- `inverse`: Eb/N0 for a wanted rate where no closed inverse exists
- `schemes`: modulation and codes by name
- `curves`: the public questions
- `rates`: information bits, channel bits, symbols
- `symbols`, `waveform`: Gray maps; pulses, I and Q, matched filter
- `impairments`, `interference`, `impaired`: what a real modem adds, its neighbours' share, and the rates
"""

from linetest.theory.curves import (
    bit_error_rate,
    curve_uncertainty_db,
    required_ebn0_db,
    symbol_error_rate,
    trusted_ber_range,
    union_bound,
)
from linetest.theory.impaired import IMPAIRED_SCHEMES, impaired_bit_error_rate, impaired_ebn0_db
from linetest.theory.impairments import Impairments
from linetest.theory.rates import SchemeRates, scheme_rates
from linetest.theory.schemes import SCHEMES

__all__ = [
    "IMPAIRED_SCHEMES",
    "SCHEMES",
    "Impairments",
    "SchemeRates",
    "bit_error_rate",
    "curve_uncertainty_db",
    "impaired_bit_error_rate",
    "impaired_ebn0_db",
    "required_ebn0_db",
    "scheme_rates",
    "symbol_error_rate",
    "trusted_ber_range",
    "union_bound",
]
