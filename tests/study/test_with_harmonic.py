"""What an RMS device reads of displacement with a third harmonic on it: root sum of squares, by 3-4-5 triangles."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.study.third_harmonic import ThirdHarmonic, third_harmonic, with_harmonic
from tests.study import yard


def test_v0_and_n_to_pe_grow_as_root_sum_of_squares_in_their_own_direction() -> None:
    # V0 of 3 V and 4 V of harmonic read 5 V, N to PE 6 V and 8 V read 10 V; neither turns, and no line-to-line moves.
    balanced = 230 * np.exp(-2j * np.pi * np.arange(3) / 3)
    tap = np.append(balanced + 3j, 6.0)
    found = with_harmonic(tap, ThirdHarmonic(4.0, 8.0))
    assert found[:-1].mean() == pytest.approx(5j)
    assert found[-1] == pytest.approx(10.0)
    assert np.diff(found[:-1]) == pytest.approx(np.diff(tap[:-1]))


def test_without_displacement_the_harmonic_itself_is_read() -> None:
    tap = np.append(230 * np.exp(-2j * np.pi * np.arange(3) / 3), 0.0)
    found = with_harmonic(tap, ThirdHarmonic(4.0, 2.0))
    assert (abs(found[:-1].mean()), abs(found[-1])) == pytest.approx((4.0, 2.0))


def test_third_harmonic_amperes_meet_every_neutral_on_their_way_three_times(tmp_path: Path) -> None:
    # Loads of 6.9 kVA on each line at the shed, 10 % third harmonic: 3 A a line. Source 0.01 + 3 x 0.02 ohm, Main
    # 0.02 + 3 x 0.02, shed 0.05 + 3 x 0.05, reactances 0.01, 3 x 0.03, and 0.01 + 3 x 0.01 twice, three times as much.
    loads = "".join(yard.load("Shed", f"L{k}-N", 6.9, f"rectifier {k}") for k in (1, 2, 3))
    site = yard.site(tmp_path, loads=loads)
    site = replace(
        site,
        loads=tuple(replace(load, third_harmonic_percent=10.0) for load in site.loads),
        source=replace(site.source, line_ohm=0.01 + 0.01j, neutral_ohm=0.02 + 0.03j),
    )
    found = third_harmonic(site, "Shed")
    ohms = complex(0.07 + 0.08 + 0.20, 3 * (0.10 + 0.04 + 0.04))
    assert found.v0_v == pytest.approx(3 * abs(ohms))
    assert found.n_pe_v == pytest.approx(3 * 3 * abs(complex(0.02 + 0.05, 3 * 0.02)))
