"""Intervals of very few states: one state says next to nothing, none says nothing."""

import pytest
from scipy.stats import binomtest

from relaycfg.study.shares import share


@pytest.mark.parametrize(("count", "of"), [(0, 1), (1, 1), (1, 2)])
def test_one_or_two_states_have_the_interval_of_a_reference_library(count: int, of: int) -> None:
    # scipy's binomtest, method "wilson".
    reference = binomtest(count, of).proportion_ci(0.95, method="wilson")
    found = share(count, of)
    assert (found.count, found.of) == (count, of)
    assert (found.low, found.high) == pytest.approx((reference.low, reference.high), abs=1e-12)


def test_of_no_state_anything_may_be_so() -> None:
    none = share(0, 0)
    assert (none.low, none.high) == (0.0, 1.0)
