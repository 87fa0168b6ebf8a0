"""Load shares read off a meter, down to a line that carries next to nothing."""

import numpy as np
import pytest

from relaycfg.study import read_meter

U0_V = 230.0


@pytest.mark.parametrize("shares", [(0.6, 0.39, 0.01), (0.5, 0.5, 0.0), (0.98, 0.01, 0.01)])
def test_a_line_with_next_to_no_load_has_its_small_share(shares: tuple[float, float, float]) -> None:
    # Millman behind a stiff source: the neutral stands at the shares' weighted mean of the lines.
    lines = U0_V * np.exp(-2j * np.pi * np.arange(3) / 3)
    first, second, third = np.abs(lines - lines @ np.array(shares)).tolist()
    between = U0_V * 3**0.5
    reading = read_meter((first, second, third), (between, between, between), U0_V)
    assert reading.load_shares == pytest.approx(shares, abs=1e-6)


def test_the_source_s_volts_are_said_to_come_from_where_they_do() -> None:
    alone = read_meter((172.0, 263.0, 263.0), None, U0_V)
    between = read_meter((172.0, 263.0, 263.0), (398.0, 398.0, 398.0), U0_V)
    assert alone.source_from == "the three readings themselves"
    assert between.source_from == "the line-to-line readings"
    assert between.source_v == pytest.approx(398 / 3**0.5)
