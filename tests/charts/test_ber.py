"""The bit error rate chart, read back with a ruler."""

from __future__ import annotations

import math

import pytest
from scipy.special import erfc

from linetest.charts import BerCurve, BerPoint, ber_chart, ber_range_db, theory_curve
from linetest.errors import ParameterError
from tests.charts.drawing import by_class, parse, rulers, trace, words

POINTS = (
    BerPoint(6.79, 22_528, 21, 5.77e-4, 1.42e-3, 0.12, "1", "ACCEPT", 2.85e-3),
    BerPoint(9.58, 101_000, 14, 7.58e-5, 2.33e-4, 0.12, "2", "REJECT", 6.9e-5),
    BerPoint(10.52, 4_489_216, 0, 0.0, 8.22e-7, 0.12, "3", "UNDECIDED", None),
)
A_TENTH_OF_A_UNIT = 0.06  # coordinates are written to one decimal


def curves() -> list[BerCurve]:
    low_db, high_db = ber_range_db(POINTS)
    return [
        theory_curve("qpsk", low_db, high_db, name="theory"),
        theory_curve("qpsk", low_db, high_db, loss_db=1.0, kind="limit", name="limit"),
    ]


def qpsk(ebn0_db: float) -> float:
    """Gray-coded QPSK: half the complementary error function of the root of Eb/N0 (Proakis, Digital Communications)."""
    return float(0.5 * erfc(math.sqrt(10.0 ** (ebn0_db / 10.0))))


@pytest.mark.parametrize(("kind", "loss_db"), [("theory", 0.0), ("limit", 1.0)])
def test_a_curve_read_from_the_paper_is_theory(kind: str, loss_db: float) -> None:
    root = parse(ber_chart(curves(), POINTS))
    ebn0_db, exponent = rulers(root)
    decade = abs(exponent.first - exponent.last) / abs(exponent.first_value - exponent.last_value)
    (drawn,) = by_class(root, kind)
    spots = trace(drawn)
    assert len(spots) > 40
    for x, y in spots:
        # A tenth of a unit across moves the curve by less than a third of that down at these slopes.
        assert exponent(y) == pytest.approx(
            math.log10(qpsk(ebn0_db(x) - loss_db)), abs=2.0 * A_TENTH_OF_A_UNIT / decade
        )


def test_a_point_read_from_the_paper_is_what_was_counted() -> None:
    root = parse(ber_chart(curves(), POINTS))
    ebn0_db, exponent = rulers(root)
    (dot,) = by_class(root, "dot")
    assert ebn0_db(float(dot.get("cx", "nan"))) == pytest.approx(6.79, abs=0.002)
    assert 10.0 ** exponent(float(dot.get("cy", "nan"))) == pytest.approx(21 / 22_528, rel=0.01)


def test_an_estimate_takes_the_place_of_errors_by_bits() -> None:
    """After a sequential stop errors by bits is biased, and may even lie outside the interval."""
    root = parse(ber_chart(curves(), [BerPoint(6.79, 22_528, 21, 9.6e-4, 1.42e-3, estimate=1.1e-3)]))
    _, exponent = rulers(root)
    (dot,) = by_class(root, "dot")
    assert 10.0 ** exponent(float(dot.get("cy", "nan"))) == pytest.approx(1.1e-3, rel=0.01)


def test_the_interval_is_drawn_from_low_to_high() -> None:
    root = parse(ber_chart([], POINTS[:1]))
    _, exponent = rulers(root)
    (bars,) = by_class(root, "err")
    drawing = bars.get("d", "")
    top, bottom = drawing.split("V")[0].split()[-1], drawing.split("V")[1].split("M")[0]
    assert 10.0 ** exponent(float(top)) == pytest.approx(1.42e-3, rel=0.01)
    assert 10.0 ** exponent(float(bottom)) == pytest.approx(5.77e-4, rel=0.01)


def test_judgement_is_told_by_shape_and_no_errors_by_an_arrow() -> None:
    root = parse(ber_chart(curves(), POINTS))
    assert len(by_class(root, "dot")) == 1
    assert len(by_class(root, "cross")) == 1
    assert len(by_class(root, "hollow")) == 0  # the undecided point has no error: an arrow from its upper limit
    arrows = [bars for bars in by_class(root, "err") if "l3.5 6" in bars.get("d", "")]
    assert len(arrows) == 1
    undecided = BerPoint(8.0, 1000, 3, 1e-3, 8e-3, judgement="UNDECIDED")
    assert len(by_class(parse(ber_chart([], [undecided])), "hollow")) == 1


def test_the_text_alternative_tells_every_point_and_curve() -> None:
    root = parse(ber_chart(curves(), POINTS, title="Bit error rate of BQ4-000123", ident="here"))
    assert root.get("role") == "img"
    assert root.get("aria-labelledby") == "here-t here-d"
    title, description = root[0], root[1]
    assert title.get("id") == "here-t"
    assert title.text == "Bit error rate of BQ4-000123"
    said = description.text or ""
    for part in ("theory; limit", "9.32 × 10^-4 (21 errors)", "no error in 4489216 bits", "REJECT", "UNDECIDED"):
        assert part in said


def test_hostile_names_stay_text() -> None:
    name = "</text><script>alert(1)</script>\"'&\u202e"
    point = BerPoint(8.0, 1000, 3, 1e-3, 8e-3, name=name)
    drawn = ber_chart([theory_curve("qpsk", 7.0, 9.0, name=name)], [point], title=name)
    root = parse(drawn)
    assert not [element for element in root.iter() if element.tag.endswith("script")]
    assert "\u202e" not in drawn
    assert any("<script>" in text for text in words(root))


def test_a_file_of_its_own_carries_its_style_and_nothing_from_outside() -> None:
    drawn = ber_chart(curves(), POINTS, standalone=True)
    root = parse(drawn)
    assert [element for element in root.iter() if element.tag.endswith("style")]
    assert "http" not in drawn.replace("http://www.w3.org/2000/svg", "")
    assert "url(" not in drawn.replace("url(#ber-c)", "")
    assert "<style" not in ber_chart(curves(), POINTS)


def test_a_second_theory_and_a_curve_alone_can_be_drawn() -> None:
    second = theory_curve("de-qpsk", 5.0, 9.0, kind="second")
    root = parse(ber_chart([theory_curve("qpsk", 5.0, 9.0), second], []))
    assert len(by_class(root, "second")) == 1
    assert "dotted: theory DE-QPSK" in words(root)


@pytest.mark.parametrize("levels_db", [(5.4,), (6.8, 8.4), (6.79, 8.43, 9.58, 10.52)])
def test_the_range_shows_every_point_with_air_and_is_never_too_narrow(levels_db: tuple[float, ...]) -> None:
    low_db, high_db = ber_range_db([BerPoint(level_db, 1000, 3, 1e-3, 8e-3) for level_db in levels_db])
    assert low_db <= min(levels_db) - 0.5
    assert high_db >= max(levels_db) + 0.5
    assert high_db - low_db >= 3.5
    assert (2.0 * low_db).is_integer()
    assert (2.0 * high_db).is_integer()


def test_nothing_to_draw_is_refused() -> None:
    with pytest.raises(ParameterError, match="hold a point where there is no curve"):
        ber_chart([], [])


def test_a_point_that_cannot_be_is_refused() -> None:
    with pytest.raises(ParameterError, match="lie between 0 and the 10 bits counted"):
        BerPoint(8.0, 10, 11, 0.0, 1.0)
    with pytest.raises(ParameterError, match=r"hold the bit error rate of 0\.5"):
        BerPoint(8.0, 10, 5, 0.6, 0.9)


def test_an_unknown_scheme_is_refused() -> None:
    with pytest.raises(ParameterError, match="scheme"):
        theory_curve("semaphore", 5.0, 9.0)


def test_a_coded_curve_begins_where_theory_is_known() -> None:
    curve = theory_curve("qpsk+conv-1/2", -3.0, 7.0)
    assert len(curve.ber) == len(curve.ebn0_db) > 10
    assert all(0.0 < rate < 0.5 for rate in curve.ber)


def test_a_chart_is_small_and_the_same_every_time() -> None:
    """The general plotting library's picture of the same curve takes 55 KB; ours is to stay below 12 KB."""
    first, second = ber_chart(curves(), POINTS, standalone=True), ber_chart(curves(), POINTS, standalone=True)
    assert first == second
    assert len(first.encode()) < 12_000
