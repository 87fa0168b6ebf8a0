"""Corners switch the motors of a line with its loads, and leave everything on more than one line as connected."""

import pytest

from relaycfg.network import corners
from tests.network.sites import board, load, motor, site

OFF, RUNNING = 0, 1


@pytest.mark.parametrize("line", ["L1", "L2", "L3"])
def test_a_motor_on_one_line_runs_where_the_line_is_high_or_it_always_runs(line: str) -> None:
    """Source: contract."""
    at_times, always = (motor("A", 1e3 + 1e3j, 2e3 + 5e3j, line, usage=usage) for usage in (0.5, 1.0))
    others = [motor("A", 1e3 + 1e3j, 2e3 + 5e3j, place, usage=0.5) for place in ("all", "L1-L2")]
    star = motor("A", 1e3 + 1e3j, 2e3 + 5e3j, "all", to_neutral=True, usage=0.5)
    states = corners(site([board("A")], [load("A", line, 1e3, usage=0.5)], [at_times, always, *others, star]))
    assert states.count == 8
    for column, name in enumerate(states.names):
        high = f"{line} high" in name
        assert states.motors[:, column].tolist() == [RUNNING if high else OFF, RUNNING, RUNNING, RUNNING, RUNNING]
        assert states.loads[0, column] == (1.0 if high else 0.0)
