"""Error rates after Viterbi decoding of the K=7 (171, 133) codes, simulated.

Made by ``python -m tests.theory.simulate_decoder_tables``, which names how a row is reproduced from its
seed. Random data, antipodal channel bits, white Gaussian noise, whole-frame decisions; soft values of 32
steps between zero and a noiseless bit.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class DecoderRow:
    """One simulated point.

    Attributes:
        ebn0_db: Eb/N0 per information bit in dB.
        seed: Seed of the generator (SFC64).
        bits: Information bits compared.
        errors: Wrong bits among them.
        events: Error events, apart by six right bits or more.
        squared_errors: Sum of the events' squared numbers of wrong bits.
    """

    ebn0_db: float
    seed: int
    bits: int
    errors: int
    events: int
    squared_errors: int

    @property
    def bit_error_rate(self) -> float:
        """Wrong bits over bits."""
        return self.errors / self.bits

    @property
    def relative_u(self) -> float:
        """Standard uncertainty of the rate over the rate; events come independently, bits in bursts."""
        return float(self.squared_errors**0.5 / self.errors)


DECODER_ROWS: dict[str, tuple[DecoderRow, ...]] = {
    "conv-1/2": (
        DecoderRow(0.0, 202503010000, 1458176, 224463, 11199, 8232943),
        DecoderRow(0.5, 202503010004, 1822720, 155261, 10120, 4309007),
        DecoderRow(1.0, 202503010008, 3280896, 130019, 10624, 2796981),
        DecoderRow(1.5, 202503010012, 6197248, 97499, 10171, 1581281),
        DecoderRow(2.0, 202503010016, 15310848, 77716, 10067, 970128),
        DecoderRow(2.5, 202503010020, 44474368, 63938, 10025, 630718),
        DecoderRow(3.0, 202503010024, 146546688, 53691, 10004, 425597),
        DecoderRow(3.5, 202503010028, 570146816, 45995, 10003, 294031),
        DecoderRow(4.0, 202503010032, 2584252416, 41616, 10001, 229176),
        DecoderRow(4.5, 202503010036, 13391888384, 38847, 10000, 192861),
    ),
    "conv-3/4": (
        DecoderRow(1.5, 202503012012, 2551808, 341865, 11311, 18705369),
        DecoderRow(2.0, 202503012016, 4009984, 247323, 10957, 9898055),
        DecoderRow(2.5, 202503012020, 7655424, 172391, 10145, 5068497),
        DecoderRow(3.0, 202503012024, 20779008, 131861, 10141, 2876353),
        DecoderRow(3.5, 202503012028, 64159744, 103886, 10021, 1734520),
        DecoderRow(4.0, 202503012032, 236224512, 84332, 10015, 1086688),
        DecoderRow(4.5, 202503012036, 946356224, 71056, 10002, 728090),
        DecoderRow(5.0, 202503012040, 4275372032, 63098, 10000, 545356),
    ),
}
