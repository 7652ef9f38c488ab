"""Error rates of modulations and codes in white Gaussian noise, and their inverses.

Pure: arrays in, arrays out. The map, in the order data takes:

- `gaussian`: the Gaussian tail; how scalars, arrays and dB pass through
- `uncoded`: closed forms and closed inverses of uncoded schemes
- `phase`: exact phase-shift keying: 8PSK, DQPSK
- `convolutional`: published distance spectra and the union bound
- `viterbi`: the decoder simulated, many frames side by side
- `inverse`: Eb/N0 for a wanted rate where no closed inverse exists
- `curves`: the schemes by name and the public questions
"""

from linetest.theory.curves import (
    SCHEMES,
    bit_error_rate,
    required_ebn0_db,
    symbol_error_rate,
    trusted_ber_range,
    union_bound,
)

__all__ = [
    "SCHEMES",
    "bit_error_rate",
    "required_ebn0_db",
    "symbol_error_rate",
    "trusted_ber_range",
    "union_bound",
]
