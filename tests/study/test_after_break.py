"""Cascade, drift, band edge and balanced rectifiers after a break, against figures worked by hand."""

from dataclasses import replace

import numpy as np
import pytest

from relaycfg.network import Network, connected, join
from relaycfg.study import derive
from relaycfg.study.band_edge import STATES, band_edges, with_edge
from relaycfg.study.cascade import cascades
from relaycfg.study.drift import drift, switching
from relaycfg.study.evidence import gather
from relaycfg.study.load_volts import load_volts
from relaycfg.study.scenarios import seen_places
from relaycfg.study.stages import active_stages
from relaycfg.study.third_harmonic import balanced_rectifiers
from tests.study import yard

NEAR = 0.03
"""Relative: the hand figures leave out the cables."""


def loads(*rows):
    """[[load]] tables of (between, kW, more keys), always on."""
    return "".join(
        yard.load("Main", between, kw, f"load {k}", usage=1.0) + more for k, (between, kw, more) in enumerate(rows)
    )


def millman(y):
    e = 230 * np.exp(-2j * np.pi * np.arange(3) / 3)
    return np.abs(e - (e * y).sum() / np.sum(y))


def broken(site, *states):
    emf = site.source.emf_v * site.supply.geometry.phasors
    return cascades(site, Network(site), "Main", join(*states) if len(states) > 1 else states[0], emf)


def test_over_volted_loads_fail_one_after_another_to_the_end(tmp_path):
    """Source: Millman by hand: 10:1:2 puts 335 V on the lightest; without it 10:2 in series across 398 V put 332 V on
    the lighter; without that the line loads are L1's alone and nothing is over its limit."""
    site = yard.site(
        tmp_path,
        loads=loads(("L1-N", 10.0, ""), ("L2-N", 1.0, "damage_pu = 1.2\n"), ("L3-N", 2.0, "damage_pu = 1.2\n")),
    )
    (found,) = broken(site, connected(site))
    assert [lost.load for lost in found.lost] == ["load 1", "load 2"]
    first = millman([10, 1, 2])
    assert found.lost[0].highest_v == pytest.approx(first.max(), rel=NEAR)
    # L2 without load: its terminals against the neutral, which stands between L1 and L3.
    assert found.lost[1].highest_v == pytest.approx(millman([10, 0, 2]).max(), rel=NEAR)
    assert found.highest_v == pytest.approx(398.4, rel=NEAR)
    assert found.resolved


def test_the_farthest_over_its_own_limit_fails_first_not_the_one_with_the_most_volts(tmp_path):
    """Source: by hand: 10:1:2 gives L2 the most volts, but a limit of 1.05 on L3 is passed by more than 1.4 on L2."""
    volts = millman([10, 1, 2]) / 230
    assert volts[1] > volts[2] > 1.2
    assert volts[1] / 1.4 < volts[2] / 1.05
    site = yard.site(
        tmp_path,
        loads=loads(("L1-N", 10.0, ""), ("L2-N", 1.0, "damage_pu = 1.4\n"), ("L3-N", 2.0, "damage_pu = 1.05\n")),
    )
    (found,) = broken(site, connected(site))
    assert found.lost[0].load == "load 2"


def test_nothing_fails_below_its_limit_and_loads_that_are_off_are_not_lost(tmp_path):
    high = loads(("L1-N", 2.0, ""), ("L2-N", 1.0, "damage_pu = 1.9\n"), ("L3-N", 1.0, "damage_pu = 1.9\n"))
    site = yard.site(tmp_path, loads=high)
    (found,) = broken(site, connected(site))
    assert found.lost == ()
    assert found.highest_v == pytest.approx(millman([2, 1, 1]).max(), rel=NEAR)
    low = high.replace("damage_pu = 1.9", "damage_pu = 1.05")
    site = yard.site(tmp_path, loads=low)
    off = connected(site)
    off.loads[1] = 0.0
    both = broken(site, connected(site), off)
    assert "load 1" in [lost.load for lost in both[0].lost]
    assert "load 1" not in [lost.load for lost in both[1].lost]


def test_volts_of_a_load_are_those_of_its_own_lines_over_its_own_nominal(tmp_path):
    """Source: by hand: a load between lines stands at 398 V, its nominal; a star at the volts of its worst line."""
    site = yard.site(
        tmp_path,
        loads=loads(
            ("L1-N", 4.0, ""), ("L2-N", 1.0, ""), ("L3-N", 1.0, ""), ("L2-L3", 0.1, ""), ("L1-L2-L3-N", 0.01, "")
        ),
    )
    network = Network(site)
    solved = network.solve("Main", connected(site), site.source.emf_v * site.supply.geometry.phasors)
    low, high = load_volts(site, network, site.loads, solved)
    star = millman([4, 1, 1]) / 230
    assert low[:3, 0] == pytest.approx(star, rel=NEAR)
    assert low[3, 0] == pytest.approx(1.0, rel=NEAR)
    assert (low[4, 0], high[4, 0]) == pytest.approx((star.min(), star.max()), rel=NEAR)


def switched(site, courses=200, cycle_s=600.0, length_s=600.0, seed=1):
    return switching(site, courses, seed, cycle_s, length_s)


def test_a_load_is_on_for_its_usage_and_switches_twice_a_mean_cycle(tmp_path):
    """Source: two-state process by hand: on u of the time, one on and one off a cycle: 2 in 600 s of a 600 s cycle."""
    rows = [yard.load("Main", "L1-N", 1.0, "u2", usage=0.2), yard.load("Main", "L2-N", 1.0, "u7", usage=0.7)]
    site = yard.site(tmp_path, loads="".join(rows) + yard.load("Main", "L3-N", 1.0, "always", usage=1.0))
    found = switched(site, 4000)
    weight = found.duration_s / found.duration_s.sum()
    share = (found.states.loads != 0) @ weight
    # 4000 courses, each of variance below a quarter: standard error below 0.008; five of them.
    assert share == pytest.approx([0.2, 0.7, 1.0], abs=0.04)
    same = found.course[1:] == found.course[:-1]
    changes = (found.states.loads[:, 1:] != found.states.loads[:, :-1])[:, same].sum(axis=1) / 4000
    # Poisson at worst: standard error sqrt(2 / 4000) = 0.022; five of them.
    assert changes[:2] == pytest.approx([2.0, 2.0], abs=0.11)
    assert changes[2] == 0
    assert np.bincount(found.course, found.duration_s) == pytest.approx([600.0] * 4000)


def test_loads_of_one_group_switch_together_and_a_seed_gives_its_course_again(tmp_path):
    rows = [yard.load("Main", f"L{k}-N", 1.0, f"g{k}", usage=0.5) + 'group = "day"\n' for k in (1, 2)]
    site = yard.site(tmp_path, loads="".join(rows) + yard.load("Main", "L3-N", 1.0, "alone", usage=0.5))
    found = switched(site)
    assert (found.states.loads[0] == found.states.loads[1]).all()
    assert (found.states.loads[0] != found.states.loads[2]).any()
    again, other = switched(site), switched(site, seed=2)
    assert (again.states.loads == found.states.loads).all()
    assert len(other.duration_s) != len(found.duration_s) or (other.duration_s != found.duration_s).any()


def test_the_drift_counts_the_steps_of_the_volts_and_its_largest(tmp_path):
    """Source: Millman by hand: only a load on L1 switches, 3:1:1 to 1:1:1 and back; V0 of 3:1:1 is 230 * 2 / 5 V."""
    always = loads(("L1-N", 1.0, ""), ("L2-N", 1.0, ""), ("L3-N", 1.0, ""))
    site = yard.site(tmp_path, loads=always + yard.load("Main", "L1-N", 2.0, "switched", usage=0.5))
    evidence = gather(site, site.relay, 50, 1)
    found = drift(evidence, evidence.network, "Main", active_stages(evidence, derive(site, 50, 1).settings), 1)
    assert found is not None
    largest = 100 * np.abs(millman([3, 1, 1]) - 230).max() / 230
    assert found.largest_step_percent == pytest.approx(largest, rel=NEAR)
    course = switched(site, 16)
    assert found.changes_per_minute == pytest.approx((len(course.duration_s) - 16) / 16 / 10)
    assert found.lowest_v < 2
    assert found.highest_v == pytest.approx(230 * 2 / 5, rel=NEAR)
    assert found.unresolved == 0
    assert not found.step_several
    for met in found.elements:
        assert met.picked_up.of == met.tripped.of == found.courses == 16
        assert met.tripped.count <= met.picked_up.count


def test_the_band_edge_moves_electronic_load_and_no_other(tmp_path):
    site = yard.site(
        tmp_path,
        loads=loads(("L1-N", 2.0, 'kind = "electronics"\n'), ("L2-N", 1.0, 'kind = "pump"\n'), ("L3-N", 1.0, "")),
    )
    before, moved = site, with_edge(site, 0.6)
    assert moved.loads[0].band_low_pu == 0.6
    assert [load.band_low_pu for load in moved.loads[1:]] == [load.band_low_pu for load in before.loads[1:]]


def test_shares_at_the_edge_that_is_stated_are_those_as_stated_and_no_state_is_dropped(tmp_path):
    rows = loads(("L1-N", 2.0, 'kind = "electronics"\nband_pu = [0.5, 1.2]\n'), ("L2-N", 1.0, ""), ("L3-N", 1.0, ""))
    more = yard.load("Main", "L2-N", 2.0, "sometimes", usage=0.5)
    site = yard.site(tmp_path, loads=rows + more)
    evidence = gather(site, site.relay, 2 * STATES, 1)
    assert site.judgement.unsteady.band_edge_pu == (0.5, 0.85)
    found = band_edges(evidence, ("Main",), active_stages(evidence, derive(site, 100, 1).settings))["Main"]
    for three in (found.harmful, found.core, found.seen):
        assert three[0] == three[1]
        assert [s.of for s in three] == [STATES] * 3
    assert found.moved_v[0][1] < 1e-5
    assert found.moved_v[1][1] > 1


def test_a_site_without_electronic_load_has_no_band_edge_to_move(tmp_path):
    site = yard.site(tmp_path)
    evidence = gather(site, site.relay, 20, 1)
    assert band_edges(evidence, seen_places(site, site.relay), ()) == {}


def rectified(folder, percent):
    rows = [(f"L{k}-N", 2.0, f"third_harmonic_percent = {percent}\n") for k in (1, 2, 3)]
    return yard.site(folder, loads=loads(*rows))


def test_few_balanced_rectifiers_push_their_third_harmonic_through_the_linear_load(tmp_path):
    """Source: by hand: a small third harmonic current I3 = 2 % of 2 kW / 230 V has to flow in the linear conductance of
    its own line, so V0 = I3 / G = 0.02 * 230 V / (1 - share), share = 0.02 / 0.953 (peak rectifier alone)."""
    found = balanced_rectifiers(rectified(tmp_path, 2.0), ("Main",), 3.0, "rms")["Main"]
    share = 0.02 / 0.953
    assert found.rectifier_percent == pytest.approx(100 * share, rel=0.01)
    assert found.third_v == pytest.approx(0.02 * 230 / (1 - share), rel=0.05)
    assert found.fundamental_v < 0.1


def test_an_rms_device_sees_balanced_rectifiers_and_a_fundamental_one_does_not(tmp_path):
    """Source: values/harmonics, rectifier-open-neutral: 36.9 V of 150 Hz with rectifiers alone, 16 % of 230 V."""
    site = rectified(tmp_path, 100.0)
    rms, fundamental = (balanced_rectifiers(site, ("Main",), 20.0, d)["Main"] for d in ("rms", "fundamental"))
    assert rms.rectifier_percent == 100
    assert rms.third_v == pytest.approx(36.9, abs=0.2)
    verdicts = {
        v: balanced_rectifiers(site, ("Main",), v, "rms")["Main"].verdict for v in (20.0, 36.0, 38.0, 45.0, None)
    }
    assert verdicts == {20.0: "sees", 36.0: "borderline", 38.0: "borderline", 45.0: "misses", None: "off"}
    assert rms.verdict == "sees"
    assert fundamental.verdict == "misses"


def test_without_a_stated_third_harmonic_nothing_is_said_of_rectifiers(tmp_path):
    assert balanced_rectifiers(rectified(tmp_path, 0.0), ("Main",), 20.0, "rms") == {}


def test_what_happens_after_a_break_stands_in_the_study_for_each_place_seen(tmp_path):
    site = yard.site(tmp_path)
    result = derive(site, 60, 1).after_break
    assert result is not None
    assert tuple(p.at for p in result.places) == seen_places(site, site.relay)
    assert result == derive(site, 60, 1).after_break
    assert result.picture is not None
    assert result.picture.begins_s[0] == 0
    assert len(result.picture.begins_s) == len(result.picture.l_n_v) == len(result.picture.v0_v)


def test_a_site_whose_judgement_allows_nothing_is_not_drifted(tmp_path):
    site = yard.site(tmp_path)
    evidence = gather(site, site.relay, 20, 1)
    still = replace(site.judgement.unsteady, switching_s=float("inf"))
    bare = replace(evidence, site=replace(site, judgement=replace(site.judgement, unsteady=still)))
    assert drift(bare, evidence.network, "Main", (), 1) is None
