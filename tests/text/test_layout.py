"""Names cut to a width so that they can still be told apart."""

import pytest

from relaycfg.text.layout import shortened


@pytest.mark.parametrize(
    ("names", "width"),
    [
        ([f"Distribution board {b}, floor {f}" for b in range(1, 6) for f in range(1, 9)], 13),
        ([f"Distribution board {b}" for b in range(1, 41)], 12),
        ([f"{b} distribution board of the yard" for b in range(1, 41)], 12),
        ([f"Distribution board {b} of the north yard" for b in range(1, 41)], 14),
    ],
)
def test_names_stay_apart_wherever_they_differ(names, width):
    cut = shortened(names, width)
    assert set(cut) == set(names)
    assert max(map(len, cut.values())) <= width
    assert len(set(cut.values())) == len(names)
    assert all(".." in form for form in cut.values())


def test_what_fits_stays_whole():
    assert shortened(["MB", "Workshop", "A far longer name"], 8) == {
        "MB": "MB",
        "Workshop": "Workshop",
        "A far longer name": "A f..ame",
    }


@pytest.mark.parametrize("width", range(9))
def test_no_width_is_too_small(width):
    assert shortened(["aaaaaaaaaaaab", "aaaaaaaaaaaac", ""], width)[""] == ""
