"""A line open at the source, and a fuse blown before a delta-star transformer, against circuits worked by hand."""

import numpy as np
import pytest

from relaycfg.model.geometry import three_phase
from relaycfg.network import Network, blown_fuse, connected, healthy_emf, least, open_line
from tests.network.sites import board, cable, impedance, load, motor, site

U0 = 230.0
PHASORS = three_phase().phasors
IDEAL = cable(1e-9 + 0j)


def behind_fuse(whole: int) -> np.ndarray:
    """EMFs behind a blown fuse at no load: one line whole, the two others in series across it, half each, opposite."""
    emf = np.full(3, -U0 / 2 * PHASORS[whole])
    emf[whole] = U0 * PHASORS[whole]
    return emf


def lines_at_a(made, cut, emf):
    solved = Network(made).solve(cut, connected(made), emf)
    assert solved.converged.all()
    return solved.l_n[0, :, 0]


def test_an_open_line_with_only_its_own_loads_is_dead_and_leaves_the_others_whole() -> None:
    """Source: by hand, nothing feeds the line."""
    made = site([board("A", cable=IDEAL)], [load("A", line, 3000.0) for line in ("L1", "L2", "L3")])
    volts = lines_at_a(made, open_line("L1"), healthy_emf(made))
    np.testing.assert_allclose(np.abs(volts), [0.0, U0, U0], atol=1e-3)


def test_loads_between_lines_feed_an_open_line_as_a_divider() -> None:
    """Source: by hand, Kirchhoff at the open line: V1 / R1 = (V2 - V1) / R12 + (V3 - V1) / R31."""
    ohm_1, ohm_12, ohm_31 = 20.0, 35.0, 50.0
    pairs = [load("A", place, 3 * U0**2 / ohm) for place, ohm in (("L1-L2", ohm_12), ("L3-L1", ohm_31))]
    made = site([board("A", cable=IDEAL)], [impedance("A", "L1", ohm_1 + 0j), *pairs])
    volts = lines_at_a(made, open_line("L1"), healthy_emf(made))
    second, third = U0 * PHASORS[1], U0 * PHASORS[2]
    by_hand = (second / ohm_12 + third / ohm_31) / (1 / ohm_1 + 1 / ohm_12 + 1 / ohm_31)
    np.testing.assert_allclose(volts, [by_hand, second, third], atol=1e-3)


def test_a_running_three_wire_motor_feeds_the_open_line_back() -> None:
    """Source: by hand, symmetrical components: with V_L2 and V_L3 held, V1 - V2 = d is known, and the open line's
    current (Y1 V1 + Y2 V2) / 3 U0^2 + V_L1 / R = 0 gives V2; a motor that starts with six times its current leaves
    more than half of the volts on the line it lost."""
    running, starting, ohm = 8000 + 5000j, 17000 + 54000j, 1e5
    machines = [motor("A", running, starting)]
    made = site([board("A", cable=IDEAL)], [impedance("A", "L1", ohm + 0j)], machines)
    y1, y2 = running.conjugate() / (3 * U0**2), starting.conjugate() / (3 * U0**2)
    d = U0 + 0j  # V_L2 - V_L3 = (a2 - a) (V1 - V2), as it is on the sound supply
    middle = U0 * (PHASORS[1] + PHASORS[2]) / 2  # of V_L2 and V_L3, V0 - (V1 + V2) / 2
    v2 = -((middle + 1.5 * d) / ohm + y1 * d) / (3 / ohm + y1 + y2)
    by_hand = middle + 3 * v2 + 1.5 * d
    assert abs(by_hand) > U0 / 2
    np.testing.assert_allclose(lines_at_a(made, open_line("L1"), healthy_emf(made))[0], by_hand, rtol=1e-4)


@pytest.mark.parametrize("whole", range(3))
def test_behind_a_blown_fuse_two_lines_share_the_volts_as_their_ohms(whole: int) -> None:
    """Source: by hand: their windings lie in series, so the two lines carry one current: a plain divider."""
    names = ("L1", "L2", "L3")
    ohms = {names[whole]: 9.0, names[whole - 2]: 10.0, names[whole - 1]: 30.0}
    made = site([board("A", cable=IDEAL)], [impedance("A", name, ohm + 0j) for name, ohm in ohms.items()])
    volts = np.abs(lines_at_a(made, blown_fuse(names[whole]), behind_fuse(whole)))
    wanted = {names[whole]: U0, names[whole - 2]: U0 * 10 / 40, names[whole - 1]: U0 * 30 / 40}
    np.testing.assert_allclose(volts, [wanted[name] for name in names], atol=1e-3)


def test_behind_a_blown_fuse_without_load_two_lines_stand_at_half() -> None:
    """Source: by hand: two equal windings in series across the third."""
    made = site([board("A", cable=IDEAL)], [load("A", "L1", 1000.0, usage=0.5)])
    volts = Network(made).solve(blown_fuse("L2"), least(made), behind_fuse(1)).l_n[0, :, 0]
    np.testing.assert_allclose(np.abs(volts), [U0 / 2, U0, U0 / 2], atol=1e-3)
    assert abs(volts.sum()) < 1e-3
