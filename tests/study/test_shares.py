"""Shares carry the Wilson interval."""

import pytest
from scipy.stats import binomtest

from relaycfg.study.shares import share


@pytest.mark.parametrize(("count", "of"), [(0, 20), (1, 20), (7, 30), (500, 1000), (2000, 2000)])
def test_the_interval_equals_that_of_a_reference_library(count: int, of: int) -> None:
    # scipy's binomtest, method "wilson".
    reference = binomtest(count, of).proportion_ci(0.95, method="wilson")
    found = share(count, of)
    assert (found.low, found.high) == pytest.approx((reference.low, reference.high), abs=1e-12)
