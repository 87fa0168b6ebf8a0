"""Supply, coil, own neutral wire and poles while the neutral is lost, against a star worked by hand.

Loads 2:1:1 on a stiff 230 V source with the neutral open: 172.5 / 263.5 / 263.5 V (Millman, own arithmetic; the
reference table has it too). Every load is always on, so that every modelled state is this one.
"""

from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.geometry import three_phase
from relaycfg.model.own_life_results import FeedLife, OwnLife
from relaycfg.model.results import Study
from relaycfg.study import check
from relaycfg.study.own_life import floating_star
from tests.cautions import bench
from tests.study import yard

STATES = 20
LOW, HIGH, BETWEEN = 172.5, 263.5, 230 * 3**0.5
AUXILIARY = '{ from = "auxiliary", range_v = [19, 29] }'


def fed(supply: str = AUXILIARY, coil: str = "auxiliary", volts: str = "[19, 29]", kind: str = "shunt") -> str:
    """The relay with that supply and coil."""
    head, _, rest = yard.RELAY.partition("supply = ")
    tail = rest.partition("output_s")[2]
    hung = f'{{ kind = "{kind}", from = "{coil}", range_v = {volts} }}'
    return f"{head}supply = {supply}\ntrip_coil = {hung}\noutput_s{tail}"


def studied(folder: Path, relay: str) -> Study:
    """Those settings checked: one overvoltage stage, 255 V and 1 s, that sees the state."""
    site = bench.star(folder, relay=relay)
    return check(site, bench.settings(site, bench.stage("overvoltage", 1, 255.0, 1.0)), STATES, 1)


def life_of(folder: Path, relay: str) -> OwnLife:
    life = studied(folder, relay).own_life
    assert life is not None
    assert life.trip_fails.of == STATES
    return life


def only(life: OwnLife) -> FeedLife:
    (feed,) = life.feeds
    return feed


@pytest.mark.parametrize(
    ("coil", "volts", "failing", "below", "above"),
    [
        ("L1-N", "[180, 253]", STATES, STATES, 0),  # 172.5 V is below 180 V
        ("L1-N", "[160, 253]", 0, 0, 0),
        ("L2-N", "[195, 253]", STATES, 0, STATES),  # 263.5 V is above 253 V
        ("L2-N", "[195, 270]", 0, 0, 0),
        ("L1-L2", "[340, 440]", 0, 0, 0),  # 398.4 V, as in the sound network
    ],
)
def test_a_shunt_coil_fails_in_every_state_in_which_its_volts_are_out_of_range(
    tmp_path: Path, coil: str, volts: str, failing: int, below: int, above: int
) -> None:
    life = life_of(tmp_path, fed(coil=coil, volts=volts))
    assert (life.trip_fails.count, only(life).below.count, only(life).above.count) == (failing, below, above)


def test_the_range_over_all_states_is_that_of_the_star_at_the_supplys_limits(tmp_path: Path) -> None:
    # The band EN 50160 all, 195.5 to 253 V, at the source: every volt of the star goes with it.
    feed = only(life_of(tmp_path, fed(coil="L1-N", volts="[160, 253]")))
    assert (feed.lowest_v, feed.highest_v) == pytest.approx((LOW * 195.5 / 230, LOW * 253 / 230), abs=0.1)


def test_time_above_the_range_is_that_of_the_trip_for_a_coil_that_is_always_on(tmp_path: Path) -> None:
    # A shunt coil carries the volts for its own time only, 0.03 s; a contactor's coil until the switch is open.
    shunt = only(life_of(tmp_path / "a", fed(coil="L2-N", volts="[195, 253]")))
    study = studied(tmp_path / "b", fed(coil="L2-N", volts="[195, 253]", kind="contactor"))
    assert study.own_life is not None
    assert shunt.above_s == pytest.approx(0.03)
    assert only(study.own_life).above_s == pytest.approx(study.stages[0].clearing_s)
    assert 1.0 < study.stages[0].clearing_s < 1.2
    assert study.own_life.trip_fails.count == STATES


def test_a_release_opens_by_itself_below_its_range_and_promises_nothing_above(tmp_path: Path) -> None:
    below = life_of(tmp_path / "a", fed(coil="L1-N", volts="[180, 253]", kind="undervoltage release"))
    above = life_of(tmp_path / "b", fed(coil="L2-N", volts="[180, 253]", kind="undervoltage release"))
    assert (below.trip_fails.count, above.trip_fails.count) == (0, STATES)
    assert only(below).below.count == STATES
    assert only(below).opens_itself


def test_a_release_is_judged_against_the_cases_that_must_hold(tmp_path: Path) -> None:
    study = studied(tmp_path, fed(coil="L1-N", volts="[180, 253]", kind="undervoltage release"))
    assert study.own_life is not None
    lost = {h.name: h for h in only(study.own_life).held_losses}
    interruption = next(h for name, h in lost.items() if "interruption" in name)
    assert (interruption.lowest_v, interruption.seconds) == pytest.approx((0.0, 0.3))
    for case in study.cases:  # every case whose lowest volts on any line stay above 180 V must be missing
        if case.lowest_l_n_v >= 180.0:
            assert case.name not in lost
    finding = next(f for f in study.findings if "by itself in" in f.sentence)
    assert finding.exception
    assert f"in {len(lost)} cases" in finding.sentence


def test_a_shunt_coil_is_not_judged_against_them(tmp_path: Path) -> None:
    assert only(life_of(tmp_path, fed(coil="L1-N", volts="[180, 253]"))).held_losses == ()


def test_self_opening_supply_and_release_leave_only_what_is_above_a_range(tmp_path: Path) -> None:
    starved = life_of(tmp_path / "a", fed(supply='{ from = "L1-N", range_v = [195, 253] }'))
    burnt = life_of(tmp_path / "b", fed(supply='{ from = "L2-N", range_v = [195, 253] }'))
    assert (starved.trip_fails.count, starved.self_opening_fails.count) == (STATES, 0)
    assert (burnt.trip_fails.count, burnt.self_opening_fails.count) == (STATES, STATES)


def test_an_auxiliary_source_is_no_feed_of_the_system(tmp_path: Path) -> None:
    life = life_of(tmp_path, fed())
    assert life.feeds == ()
    assert life.trip_fails.count == 0


def test_three_equal_inputs_without_neutral_read_the_source_whatever_the_board_has() -> None:
    # By hand: the star of equal inputs stands where the sum of its three currents is nothing, at the mean of the lines.
    phasors = 230 * three_phase().phasors
    for shift in (0.0, -57.5, 100 + 40j):
        tap = np.append(phasors - shift, np.nan)[None]
        read = floating_star(tap)
        np.testing.assert_allclose(read[0, :-1], phasors, atol=1e-9)


def test_a_loose_sensing_neutral_hides_every_break(tmp_path: Path) -> None:
    sensing = life_of(tmp_path, fed()).sensing
    assert sensing is not None
    assert sensing.broken_true_v == pytest.approx((LOW, HIGH, HIGH), abs=0.1)
    assert sensing.broken_l_n_v == pytest.approx((230.0,) * 3, abs=1e-3)
    assert sensing.broken_v0_v == pytest.approx(0.0, abs=1e-6)
    assert sensing.sound_operates == ()
    assert (sensing.cleared.count, sensing.cleared_before.count) == (0, STATES)
    assert sensing.fed_l_n_v is None


def test_a_relay_fed_through_its_sensing_neutral_reads_a_lost_one_on_a_sound_board(tmp_path: Path) -> None:
    # By hand: its star is drawn to the line that feeds it: 0 V there, line-to-line volts on the two others.
    sensing = life_of(tmp_path, fed(supply='{ from = "L1-N", range_v = [90, 300] }')).sensing
    assert sensing is not None
    assert sensing.fed_l_n_v == pytest.approx((0.0, BETWEEN, BETWEEN), abs=1e-3)
    assert sensing.fed_operates == ("59 stage 1",)


def test_a_neutral_pole_out_of_order_is_a_lost_neutral_behind_the_switch(tmp_path: Path) -> None:
    site = yard.site(tmp_path)
    study = check(site, bench.settings(site, bench.stage("overvoltage", 1, 255.0, 1.0)), 100, 1)
    assert study.own_life is not None
    at_main = next(s for s in study.breaks.summaries if s.at == "Main")
    poles = study.own_life.poles
    assert poles.early_v == pytest.approx(at_main.percentiles[0].largest)
    assert poles.early_harmful is not None
    assert poles.early_harmful.count == 0  # no step of the curve is shorter than the spread of the poles, 0.02 s
    assert poles.after_pe_v is not None
    assert poles.after_pe_v < 1.0  # nothing is left on the broken neutral that could lift it
    assert poles.not_modelled_at == ()


def test_metalwork_on_a_pen_without_other_users_in_the_model_has_no_figure_after_the_trip(tmp_path: Path) -> None:
    # Neighbours on the same PEN lift it; where none is modelled, 0 V would be a statement about them.
    site = yard.site(tmp_path, earthing="TN-C-S")
    life = check(site, bench.settings(site, bench.stage("overvoltage", 1, 255.0, 1.0)), 50, 1).own_life
    assert life is not None
    assert life.poles.after_pe_v is None
    assert "Main" in life.poles.not_modelled_at
