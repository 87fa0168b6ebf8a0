"""Deadlines read the withstand curve as printed: from v on, at most s."""

import numpy as np
import pytest

from relaycfg.model.site import Equipment
from relaycfg.study.deadlines import high_deadline_s, is_core, low_deadline_s

# Own reading of a step curve, figures invented.
EQUIPMENT = Equipment(
    255.0, 15.0, ((275.0, 15.0), (300.0, 5.0), (400.0, 0.2)), 184.0, 10.0, ((150.0, 1.0),), "", "", ""
)


@pytest.mark.parametrize(
    ("volts", "seconds"),
    [(255.0, np.inf), (255.1, 15.0), (299.9, 15.0), (300.0, 5.0), (399.9, 5.0), (400.0, 0.2), (600.0, 0.2)],
)
def test_a_high_voltage_takes_the_last_point_it_reaches(volts: float, seconds: float) -> None:
    assert high_deadline_s(EQUIPMENT, np.array([volts]))[0] == seconds


@pytest.mark.parametrize(("volts", "seconds"), [(184.0, np.inf), (183.9, 10.0), (150.0, 1.0), (0.0, 1.0)])
def test_a_low_voltage_takes_the_last_point_it_falls_to(volts: float, seconds: float) -> None:
    assert low_deadline_s(EQUIPMENT, np.array([volts]))[0] == seconds


def test_only_the_first_high_point_and_the_worst_low_point_are_core() -> None:
    high = np.array([274.9, 275.0, 230.0, 230.0])
    low = np.array([230.0, 230.0, 150.1, 150.0])
    assert is_core(EQUIPMENT, high, low).tolist() == [False, True, False, True]
