"""Figures as text."""

import math

import pytest

from relaycfg import units


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (units.volts(63.56), "63.6"),
        (units.volts(-0.04), "0.0"),
        (units.volts(None), "-"),
        (units.volts(math.nan), "-"),
        (units.seconds(0.08), "0.080"),
        (units.seconds(4), "4.00"),
        (units.seconds(math.inf), "for ever"),
        (units.seconds(None), "-"),
        (units.percent(12.345), "12.3"),
        (units.whole_volts(263.5), "264"),
        (units.whole_volts(None), "-"),
        (units.degrees(-0.2), "0"),
        (units.parts(0.96), "1.0"),
        (units.asymmetry(2.004), "2.00"),
        (units.asymmetry(None), "-"),
        (units.watts(12345.6), "12 346"),
        (units.watts(None), "-"),
        (units.ohms(0.051234), "0.0512"),
        (units.ohms(999.4), "999"),
        (units.ohms(999.6), "1 000"),
        (units.ohms(12345.6), "12 346"),
        (units.ratio(0.97), "0.97"),
        (units.ratio(1.0), "1"),
        (units.count(1234567), "1 234 567"),
        (units.plain(230.0), "230"),
        (units.with_unit(265.04, "V"), "265.0 V"),
        (units.with_unit(None, "V"), "-"),
        (units.with_unit(math.inf, "s"), "for ever"),
        (units.with_unit(1.5, "points"), "1.5 points"),
    ],
)
def test_figures(text, expected):
    assert text == expected
