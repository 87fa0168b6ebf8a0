"""The pickup whose end of the error band is a given severity, by hand, and the times of a measuring window."""

import dataclasses

import numpy as np
import pytest

from relaycfg.model.device import Accuracy
from relaycfg.relay import (
    measuring_s,
    pickup_at_least_sensitive,
    pickup_at_most_sensitive,
    pickups_least_sensitive,
    pickups_most_sensitive,
    refresh_s,
    window_s,
)

# The device's errors are 2 percent of the setting and 3 V. The greater of both: 4 V at 200 V, 3 V at 100 V (150 V is
# where they are equal). Their sum: 7 V at 200 V, 5 V at 100 V.
ENDS = [
    ("59", "greater", 200.0, 196.0, 204.0),
    ("59", "greater", 100.0, 97.0, 103.0),
    ("59", "sum", 200.0, 193.0, 207.0),
    ("59", "sum", 100.0, 95.0, 105.0),
    ("59N", "greater", 100.0, 97.0, 103.0),
    ("27", "greater", 200.0, -204.0, -196.0),
    ("27", "greater", 100.0, -103.0, -97.0),
    ("27", "sum", 200.0, -207.0, -193.0),
    ("27", "sum", 100.0, -105.0, -95.0),
]


@pytest.mark.parametrize(("function", "combine", "pickup", "most", "least"), ENDS)
def test_a_pickup_and_the_ends_of_its_band_lead_to_each_other(elements, function, combine, pickup, most, least):
    """Source: own arithmetic on the definition of the band, both ways."""
    element = dataclasses.replace(elements[function], accuracy=Accuracy(2.0, 3.0, 1.0, 0.03, combine))
    assert pickups_most_sensitive(element, np.array(pickup)) == pytest.approx(most)
    assert pickups_least_sensitive(element, np.array(pickup)) == pytest.approx(least)
    assert pickup_at_most_sensitive(element, most) == pytest.approx(pickup)
    assert pickup_at_least_sensitive(element, least) == pytest.approx(pickup)


def test_longest_measuring_is_a_window_and_a_refresh_of_the_supplys_cycles(device):
    """Source: definition: 3 cycles of window and a quarter of refresh at 60 Hz are 50 and 4.17 ms."""
    device = dataclasses.replace(device, window_cycles=3.0, refresh_cycles=0.25)
    assert window_s(device, 60.0) == pytest.approx(0.05)
    assert refresh_s(device, 60.0) == pytest.approx(0.25 / 60)
    assert measuring_s(device, 60.0) == pytest.approx(0.05 + 0.25 / 60)
