"""Load states: what is on, and that a seed means the same states however they are asked for."""

import numpy as np
import pytest

from relaycfg.model.site import Site
from relaycfg.network import Network, connected, corners, healthy_emf, join, least, sampled
from tests.network.sites import board, cable, load, motor, site


def mixed() -> Site:
    """Loads always and sometimes on, a group, stars, line loads, motors."""
    loads = [
        load("A", "L1", 1e3, name="always", demand=0.6),
        load("A", "L1", 2e3, name="day 1", usage=0.3, demand=0.9, group="day"),
        load("A", "L2", 2e3, name="day 2", usage=0.3, group="day"),
        load("A", "L3", 2e3, name="free", usage=0.7, demand=0.5),
        load("A", "L1-L2", 2e3, name="line", usage=0.2),
        load("A", "all", 6e3, name="star", to_neutral=True, usage=0.5),
        load("A", "L2", -1e3, name="roof", usage=0.4),
    ]
    motors = [motor("A", 4e3 + 3e3j, 8e3 + 24e3j, usage=0.25), motor("A", 1e3 + 1e3j, 2e3 + 5e3j, "L3", usage=1.0)]
    return site([board("A", cable=cable(0.1 + 0.05j))], loads, motors, line_ohm=0.01 + 0.02j)


def test_connected_is_every_load_at_its_rating() -> None:
    states = connected(mixed())
    assert states.loads[:, 0].tolist() == [1] * 7
    assert states.motors[:, 0].tolist() == [1, 1]
    assert states.names == ("connected",)


def test_least_is_only_what_is_always_on() -> None:
    states = least(mixed())
    assert states.loads[:, 0].tolist() == [0.6, 0, 0, 0, 0, 0, 0]
    assert states.motors[:, 0].tolist() == [0, 1]


def test_corners_set_each_line_to_an_extreme() -> None:
    states = corners(mixed())
    assert len(states.names) == states.count == 8
    assert len(set(states.names)) == 8
    column = states.names.index("L1 low, L2 high, L3 low")
    assert states.loads[:, column].tolist() == [0.6, 0, 1, 0, 1, 1, 1]
    assert states.motors[:, column].tolist() == [1, 1]
    assert states.loads[:, states.names.index("L1 high, L2 high, L3 high")].tolist() == [1] * 7


def test_first_states_never_depend_on_how_many_are_asked_for() -> None:
    few, many = sampled(mixed(), 100, 7), sampled(mixed(), 9000, 7)
    assert np.array_equal(few.loads, many.loads[:, :100])
    assert np.array_equal(few.motors, many.motors[:, :100])
    assert few.names == many.names[:100]


def test_states_do_not_depend_on_where_a_worker_begins() -> None:
    whole, part = sampled(mixed(), 9000, 7), sampled(mixed(), 4500, 7, start=4200)
    assert np.array_equal(part.loads, whole.loads[:, 4200:8700])
    assert np.array_equal(part.motors, whole.motors[:, 4200:8700])
    assert part.names[0] == "sample 4200"


def test_seeds_and_chunks_differ() -> None:
    first, second = sampled(mixed(), 8192, 1), sampled(mixed(), 8192, 2)
    assert not np.array_equal(first.loads, second.loads)
    assert not np.array_equal(first.loads[:, :4096], first.loads[:, 4096:])


def test_usage_is_the_share_of_states_a_load_is_on() -> None:
    states = sampled(mixed(), 40_000, 3)
    on = (states.loads > 0).mean(axis=1)
    # five standard deviations of a share over 40 000 states are at most 0.0125
    assert on == pytest.approx([1.0, 0.3, 0.3, 0.7, 0.2, 0.5, 0.4], abs=0.0125)
    assert (states.motors == 1).mean(axis=1) == pytest.approx([0.25, 1.0], abs=0.0125)
    assert set(np.unique(states.loads[3])) == {0.0, 0.5}


def test_loads_of_a_group_switch_together_and_others_do_not() -> None:
    on = sampled(mixed(), 5000, 3).loads > 0
    assert np.array_equal(on[1], on[2])
    assert abs(np.corrcoef(on[1], on[3])[0, 1]) < 0.07  # five standard deviations of 1 / sqrt(5000)


def test_take_and_join_keep_states_and_names_together() -> None:
    states = join(connected(mixed()), least(mixed()), sampled(mixed(), 5, 1))
    assert states.names == ("connected", "least", *(f"sample {k}" for k in range(5)))
    picked = states.take([6, 0])
    assert picked.names == ("sample 4", "connected")
    assert np.array_equal(picked.loads, states.loads[:, [6, 0]])


def test_site_without_loads_has_states_all_the_same() -> None:
    empty = site([board("A")])
    states = join(connected(empty), least(empty), corners(empty), sampled(empty, 3, 1))
    solved = Network(empty).solve("source", states, healthy_emf(empty))
    assert solved.converged.all()
    assert np.abs(solved.l_n) == pytest.approx(np.full((1, 3, 13), 230.0), abs=1e-6)
