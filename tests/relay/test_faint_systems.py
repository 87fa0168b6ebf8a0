"""Unbalance where there is hardly anything to measure: formed from 10 V of mean volts on, finite whatever is left."""

import numpy as np
import pytest

from relaycfg.relay import measured_quantities


def unbalance(geometry, *magnitudes):
    """All definitions on line-to-neutral volts at the source's angles."""
    return measured_quantities(geometry, np.append(np.array(magnitudes) * geometry.phasors, np.nan))[
        "unbalance_percent"
    ]


def test_unbalance_is_formed_from_ten_volts_of_mean_on(geometry):
    """Source: own arithmetic: 12, 12 and 6 V have a mean of 10 V, a deviation of 4 V and a spread of 6 V."""
    at = unbalance(geometry, 12.0, 12.0, 6.0 + 1e-9)
    assert at["line-to-neutral deviation"] == pytest.approx(40.0)
    assert at["spread"] == pytest.approx(60.0)
    assert at["V2/V1"] == pytest.approx(100 * 2 / 10)  # (12 a^0 + 12 a^2 + 6 a^4) / 3 is 2 V
    exact = measured_quantities(geometry, np.array([12.0, 12.0, 6.0, np.nan], complex))["unbalance_percent"]
    assert exact["line-to-neutral deviation"] == pytest.approx(40.0)
    assert [float(x) for x in unbalance(geometry, 12.0, 12.0, 5.9).values()] == [0.0] * 4


def test_unbalance_of_a_course_is_that_of_each_of_its_taps(geometry):
    """Source: array equals scalar."""
    taps = np.array([[230.0, 200, 180], [230, 230, 230], [100, 240, 30]])[:, np.newaxis] * geometry.phasors
    whole = measured_quantities(geometry, np.insert(taps, 3, np.nan, axis=-1))
    for k, row in enumerate(taps[:, 0]):
        one = measured_quantities(geometry, np.append(row, np.nan))
        assert whole["l_l_v"][k, 0] == pytest.approx(one["l_l_v"])
        assert whole["l_n_v"][k, 0] == pytest.approx(one["l_n_v"])
        assert whole["v0_v"][k, 0] == pytest.approx(one["v0_v"])
        for name, percent in whole["unbalance_percent"].items():
            assert percent[k, 0] == pytest.approx(one["unbalance_percent"][name])


def test_ratios_to_nothing_are_large_and_finite(geometry):
    """Source: own arithmetic: a reversed order has V1 = 0, one voltage on all lines no line-to-line volts at all."""
    reversed_order = np.append(230 * geometry.phasors.conj(), np.nan)
    v2_v1 = measured_quantities(geometry, reversed_order)["unbalance_percent"]["V2/V1"]
    assert 1e4 < v2_v1 < np.inf
    alike = measured_quantities(geometry, np.array([230.0, 230, 230, np.nan], complex))
    assert alike["unbalance_percent"]["line-to-line deviation"] == 0.0
    assert alike["l_l_v"].tolist() == [0, 0, 0]
    assert alike["v0_v"] == 230.0
