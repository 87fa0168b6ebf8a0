"""What is no lost neutral: volts worked by hand, and the first cause named for many readings as for each alone."""

from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.companion_results import KINDS, Companion, Companions
from relaycfg.model.geometry import three_phase
from relaycfg.study import check, read_meter
from relaycfg.study.companions import kind_of
from relaycfg.study.reading import first_causes
from tests.cautions import bench
from tests.study import yard

U0, BETWEEN = 230.0, 230 * 3**0.5
STATES = 30


@pytest.fixture(scope="module")
def found(tmp_path_factory: pytest.TempPathFactory) -> Companions:
    """Loads 2:1:1 on a stiff source, an overvoltage, an undervoltage and a displacement stage."""
    site = bench.star(tmp_path_factory.mktemp("star"))
    stages = [
        bench.stage("overvoltage", 1, 255.0, 1.0),
        bench.stage("undervoltage", 1, 185.0, 2.0),
        bench.stage("displacement", 1, 40.0, 0.5),
    ]
    companions = check(site, bench.settings(site, *stages), STATES, 1).companions
    assert companions is not None
    return companions


def named(found: Companions, start: str) -> Companion:
    return next(p for p in found.patterns if p.name.startswith(start))


def test_the_lost_neutral_stands_first_with_even_volts_between_lines(found: Companions) -> None:
    first = found.patterns[0]
    assert first.kind == "lost neutral"
    assert first.l_n_v == pytest.approx((172.5, 263.5, 263.5), abs=0.1)
    assert first.l_l_v == pytest.approx((BETWEEN,) * 3, abs=0.1)
    assert first.read_with_lines.startswith("lost or loose neutral")
    assert [o.stage for o in first.operates] == ["59N stage 1", "59 stage 1", "27 stage 1"]


def test_a_lost_line_shows_the_same_displacement_and_uneven_volts_between_lines(found: Companions) -> None:
    # 0 / U / U: V0 = U / 3 = 76.7 V, U to the two neighbours and sqrt 3 U between them.
    line = named(found, "line lost upstream, motors off")
    assert sorted(line.l_n_v) == pytest.approx([0.0, U0, U0], abs=0.01)
    assert sorted(line.l_l_v) == pytest.approx([U0, U0, BETWEEN], abs=0.01)
    assert line.v0_v == pytest.approx(76.667, abs=0.01)
    assert [o.stage for o in line.operates] == ["59N stage 1", "27 stage 1"]
    assert line.displaced
    assert "not the neutral" in line.message
    assert "it alone proves no lost neutral" in line.message
    assert "lost on the supply side" in line.read_with_lines


def test_a_blown_high_voltage_fuse_leaves_one_line_whole_and_no_displacement(found: Companions) -> None:
    # Two windings in series across the third: the two other lines add up to its volts, opposite to it.
    fuse = named(found, "high-voltage fuse")
    low, middle, whole = sorted(fuse.l_n_v)
    assert (whole, low + middle) == pytest.approx((U0, U0), abs=0.01)
    assert fuse.v0_v == pytest.approx(0.0, abs=0.01)
    assert not fuse.displaced
    assert "neutral" not in fuse.read_with_lines


def test_dips_and_high_supply_are_those_of_their_definition(found: Companions) -> None:
    # Residual 70 %: V0 = 0.3 U / 3 = 23 V with one or two lines, nothing with three.
    assert named(found, "dip, three").l_n_v == pytest.approx((161.0,) * 3, abs=0.01)
    assert named(found, "dip, three").v0_v == pytest.approx(0.0, abs=0.01)
    for start in ("dip, one", "dip, two"):
        assert named(found, start).v0_v == pytest.approx(23.0, abs=0.01)
    high = named(found, "supply high")
    assert high.l_n_v == pytest.approx((264.5,) * 3, abs=0.01)
    assert [o.stage for o in high.operates] == ["59 stage 1"]
    assert high.read_with_lines == "supply high as a whole"
    assert named(found, "dip, three").read_with_lines == "supply low as a whole"


def test_a_sensing_fuse_leaves_the_boards_volts_between_lines_even(found: Companions) -> None:
    fuse = named(found, "sensing fuse")
    assert sorted(fuse.l_n_v) == pytest.approx([0.0, U0, U0], abs=0.01)
    assert fuse.l_l_v == pytest.approx((BETWEEN,) * 3, abs=0.01)
    assert fuse.read_with_lines.startswith("sensing fuse or test lead")


def test_a_loose_sensing_neutral_reads_sound_on_a_lost_one(found: Companions) -> None:
    lost = named(found, "the same, neutral lost")
    assert lost.l_n_v == pytest.approx((U0,) * 3, abs=0.01)
    assert lost.read_with_lines == "healthy, or balanced"
    assert lost.operates == ()


def test_no_message_of_anything_else_says_the_neutral_is_lost(found: Companions) -> None:
    others = [p for p in found.patterns if p.kind == "other"]
    assert len(others) == 7
    assert not any(p.message.startswith("lost neutral") or kind_of(p.read_with_lines) == "lost neutral" for p in others)


def test_no_state_is_dropped_from_the_table_of_confusion(found: Companions) -> None:
    assert len(found.confusion) == 2 * len(found.patterns)
    for row in found.confusion:
        assert row.of + row.unresolved == STATES, row.truth
        assert sum(row.named.values()) == row.of
        assert set(row.named) <= set(KINDS)
        assert row.named_neutral.count == row.named.get("lost neutral", 0)


def test_volts_between_lines_take_the_lost_neutral_out_of_every_other_reading(found: Companions) -> None:
    # By hand: even volts between lines with an uneven neutral happen in none of these but the lost neutral.
    assert found.named_neutral("other", True)[0].count == 0
    assert found.named_neutral("lost neutral", True)[0].count == STATES


@pytest.mark.parametrize("with_lines", [True, False])
def test_the_first_cause_of_many_readings_is_that_of_each(with_lines: bool) -> None:
    draw = np.random.default_rng(7)
    kinds = draw.integers(0, 4, 1500)
    phasors = U0 * three_phase().phasors
    scale = np.where(kinds[:, None] % 2, draw.uniform(0.0, 1.3, (1500, 3)), draw.uniform(0.8, 1.25, (1500, 1)))
    shift = np.where(kinds < 2, 0, draw.uniform(0, 180, 1500) * np.exp(2j * np.pi * draw.random(1500)))
    l_n = phasors * scale - shift[:, None]
    l_l = np.abs(three_phase().line_to_line(l_n)) if with_lines else None
    volts = np.abs(l_n)
    one_by_one = [
        read_meter(tuple(volts[k]), None if l_l is None else tuple(l_l[k]), U0).causes[0].name for k in range(1500)
    ]
    assert first_causes(volts, l_l, U0) == one_by_one
    assert len(set(one_by_one)) > 8


def fed(folder: Path, supply: str, kind: str = "shunt", coil: str = "auxiliary", volts: str = "[19, 29]") -> Companions:
    """The star of the other tests with that relay supply and coil."""
    head, _, rest = yard.RELAY.partition("supply = ")
    tail = rest.partition("output_s")[2]
    hung = f'{{ kind = "{kind}", from = "{coil}", range_v = {volts} }}'
    relay = f"{head}supply = {supply}\ntrip_coil = {hung}\noutput_s{tail}"
    site = bench.star(folder, relay=relay)
    stages = [bench.stage("undervoltage", 1, 185.0, 2.0), bench.stage("displacement", 1, 40.0, 0.5)]
    found = check(site, bench.settings(site, *stages), STATES, 1).companions
    assert found is not None
    return found


def test_no_stage_operates_while_the_relay_is_unfed(tmp_path: Path) -> None:
    # By hand: with L1 or L2 lost the relay's L1-L2 is 230 V, below 300 V; with L3 lost it is 398 V. One state in three
    # loses each line.
    line = named(fed(tmp_path, '{ from = "L1-L2", range_v = [300, 460] }'), "line lost upstream, motors off")
    assert (line.unfed_share.count, line.unfed_share.of) == (2 * STATES // 3, STATES)
    if line.l_l_v[0] > 300:
        assert (line.unfed, [o.stage for o in line.operates]) == ("", ["59N stage 1", "27 stage 1"])
    else:
        assert (line.unfed, line.operates) == ("relay unfed (230 V)", ())
    assert line.displaced  # it does operate where L3 is the lost one


def test_a_relay_that_no_state_of_a_pattern_feeds_is_shown_without_stages(tmp_path: Path) -> None:
    # By hand: three lines at 70 % leave 0.7 x 398 = 279 V between them, one line at 70 % no pair below 340 V.
    found = fed(tmp_path, '{ from = "L1-L2", range_v = [300, 460] }')
    all_three, one = named(found, "dip, three lines"), named(found, "dip, one line")
    assert (all_three.unfed, all_three.operates, all_three.displaced) == ("relay unfed (279 V)", (), False)
    assert all_three.unfed_share.count == STATES
    assert (one.unfed, one.unfed_share.count) == ("", 0)
    assert [o.stage for o in one.operates] == ["27 stage 1"]


def test_a_coil_above_its_range_keeps_stages_off_and_a_release_below_its_range_opens_by_itself(tmp_path: Path) -> None:
    # The star worked by hand: 172.5 V on L1 and 263.5 V on L2 with the neutral lost.
    auxiliary = '{ from = "auxiliary", range_v = [19, 29] }'
    coil = fed(tmp_path / "coil", auxiliary, "shunt", "L2-N", "[195, 253]").patterns[0]
    release = fed(tmp_path / "release", auxiliary, "undervoltage release", "L1-N", "[180, 253]").patterns[0]
    for words, begins, volts in (
        (coil.unfed, "coil above its range", 263.5),
        (release.unfed, "release opens by itself", 172.5),
    ):
        told, _, figure = words.removesuffix(" V)").rpartition(" (")
        assert told == begins
        assert float(figure) == pytest.approx(volts, abs=0.6)  # printed to the whole volt
    assert coil.operates == release.operates == ()
