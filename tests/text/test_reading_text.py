"""Terminal text of a meter reading."""

import pytest

from relaycfg.study import read_meter
from relaycfg.text import reading_text

READINGS = [
    ((172, 263, 263), None),
    ((172, 263, 263), (398, 398, 398)),
    ((207, 253, 253), None),
    ((0, 230, 230), None),
    ((0, 230, 230), (230, 398, 230)),
    ((0, 0, 0), None),
    ((0, 230, 0), None),
    ((100, 400, 100), None),
    ((225, 238, 228), None),
    ((230, 231, 229), None),
    ((170, 230, 230), None),
    ((220, 231, 230), (398, 380, 360)),
    ((200, 200, 200), None),
    ((150, 290, 270), None),
]


@pytest.mark.parametrize(("l_n", "l_l"), READINGS)
def test_every_pattern_fits_a_screen_and_warns(l_n, l_l):
    text = reading_text(read_meter(l_n, l_l, 230.0))
    lines = text.splitlines()
    assert 10 <= len(lines) <= 35
    assert max(map(len, lines)) <= 100
    assert lines.index("What it means") < lines.index("Check first") < lines.index("Do not")
    assert "neutral on a live loaded board" in text
    assert not {"safe", "complies"} & set(text.lower().split())


def test_a_lost_neutral_is_read_with_its_figures():
    text = reading_text(read_meter((172, 263, 263), None, 230.0))
    assert "likely: lost or loose neutral" in text
    assert "V0 57.5 V (3V0 172.5 V)" in text
    assert "2.0 : 1.0 : 1.0 on L1 : L2 : L3" in text
    assert "57.5 V at 0 degrees from the source volts of L1" in text
    assert "Call the network operator" in text


def test_a_load_on_one_line_alone_is_given_against_the_largest():
    assert "1.0 : 0.0 : 0.0" in reading_text(read_meter((0, 398, 398), None, 230.0))


def test_without_a_verdict_on_the_neutral_there_are_no_figures():
    assert "V0" not in reading_text(read_meter((0, 230, 230), None, 230.0))
