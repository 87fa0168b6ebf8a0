"""Both ends of the error bands, and the times that add up to the open switch."""

import dataclasses

import numpy as np
import pytest

from relaycfg.model.device import Accuracy, Function
from relaycfg.model.settings import Stage
from relaycfg.model.site import Feed, Relay
from relaycfg.relay import (
    least_sensitive,
    most_sensitive,
    pickups_least_sensitive,
    pickups_most_sensitive,
    shortest_delay,
    total_clearing,
)


def test_most_sensitive_moves_the_pickup_towards_normal_volts(elements):
    over = most_sensitive(elements["59"], Stage(Function.OVERVOLTAGE, 1, True, 265.0, 4.0, 0.97))
    assert (over.pickup, over.dropout, over.delay_s) == pytest.approx((262.35, 254.4795, 3.96))
    under = most_sensitive(elements["27"], Stage(Function.UNDERVOLTAGE, 1, True, 177.0, 1.5, 1.03))
    assert (under.pickup, under.dropout, under.delay_s) == pytest.approx((-178.77, -184.1331, 1.47))


def test_least_sensitive_moves_it_away_and_lengthens_the_delay(elements):
    over = least_sensitive(elements["59"], Stage(Function.OVERVOLTAGE, 1, True, 265.0, 4.0, 0.97))
    assert (over.pickup, over.delay_s) == pytest.approx((267.65, 4.04))
    under = least_sensitive(elements["27"], Stage(Function.UNDERVOLTAGE, 1, True, 177.0, 1.5, 1.03))
    assert (under.pickup, under.delay_s) == pytest.approx((-175.23, 1.53))


@pytest.mark.parametrize("function", ["59", "27", "59N", "47"])
def test_the_band_has_the_same_width_either_way(elements, function):
    element = elements[function]
    pickups = element.pickup.values
    low, high = pickups_most_sensitive(element, pickups), pickups_least_sensitive(element, pickups)
    np.testing.assert_allclose(high - low, 2 * element.accuracy.pickup_error(pickups))
    assert np.all(low < high)
    np.testing.assert_allclose(np.abs(low + high) / 2, pickups)


def test_summed_errors_are_wider_than_the_greater_one(elements):
    summed = dataclasses.replace(elements["59"], accuracy=Accuracy(1.0, 1.0, 1.0, 0.03, "sum"))
    assert pickups_most_sensitive(summed, np.array(265.0)) == pytest.approx(265 - 2.65 - 1)


def test_a_delay_shorter_than_its_error_is_no_delay(elements):
    np.testing.assert_allclose(shortest_delay(elements["59"], np.array([0.02, 0.05])), [0.0, 0.02])


def test_total_clearing_counts_measuring_output_coil_and_breaker(elements, device):
    relay = Relay(
        "R1", "MB", "MB", "lines", device, Feed("L1-L2", 300, 460), "shunt", Feed("auxiliary", 19, 29), 0.01, 0.05
    )
    total = total_clearing(elements["59"], np.array([0.1, 5.0]), device, relay, 50.0)
    np.testing.assert_allclose(total, [0.1 + 0.03 + 0.02 + 0.01 + 0.06, 5.0 + 0.05 + 0.02 + 0.01 + 0.06])
