"""Loose joints and earthing as terminal text, on results built by hand."""

from dataclasses import replace

import pytest

from relaycfg.model.joint_results import EarlyWarning, JointPoint, JointSight, JointState, JointSweep
from relaycfg.model.site import TouchTimes
from relaycfg.model.touch_results import BoardTouch, EarthChoice, EarthSight, PlaceTouch, RelayTouch
from relaycfg.text import breaks_text, check_text, derive_text, study_dict
from relaycfg.text.earthing import earth_reference, touch
from relaycfg.text.joints import every_joint, hottest_joints, loose_joints
from tests.text.conftest import share

OPEN = JointPoint(float("inf"), 86.9, 0.0, 0.0, 86.9, 301.1, True)
HOT = JointPoint(5.04, 43.5, 8.63, 375.0, 43.5, 264.6, True)
SIGHTS = (
    JointSight("59 stage 1", True, 5.07, 43.6, 375.0, 375.0, 4.1),
    JointSight("59N stage 1", True, 2.58, 29.45, 336.0, 336.0, 0.8),
    JointSight("27 stage 1", False, None, None, None, 375.0, 1.6),
    JointSight("59N alarm, advised", True, 0.51, 8.0, 125.0, 125.0, None),
)
SEEN = JointSweep("MB", "N", (JointState("sample 17", (HOT, OPEN), HOT, SIGHTS, 336.0),), share(140), share(40))
BLIND = JointSweep("Workshop", "N", (JointState("sample 3", (HOT, OPEN), HOT, (), None),))
WARNING = EarlyWarning(8.0, 5.1, 4.6, "case 4", True, "Worth setting. A voltage relay is no hot-joint detector.")


@pytest.fixture
def heated(study):
    return replace(study, breaks=replace(study.breaks, joints=(SEEN, BLIND)), early_warning=WARNING)


def test_what_burns_unseen_stands_first_and_the_soonest_trip_beside_it(heated):
    lines = loose_joints(heated)
    head = next(line for line in lines if line.startswith("Place"))
    assert head.index("W, no pickup") < head.index("First to trip") < head.index("Most W")
    (row,) = [line for line in lines if line.startswith("MB")]
    assert row.split() == ["MB", "sample", "17", "336", "59N", "stage", "1", "2.58", "336", "375", "5.04", "43.5"]
    text = " ".join(lines)
    assert "Of the first 200 load states" in text
    assert "no hot-joint detector" in text


def test_derive_and_check_carry_the_joints_and_the_plain_sentence(heated):
    for text in (derive_text(heated), check_text(heated)):
        assert "Loose joint in the neutral" in text
        assert "no hot-joint detector" in text


def test_a_place_no_stage_sees_says_none(heated):
    never = replace(SEEN, states=(replace(SEEN.states[0], sights=SIGHTS[2:], unseen_w=375.0),))
    lines = loose_joints(replace(heated, breaks=replace(heated.breaks, joints=(never,))))
    assert "none" in next(line for line in lines if line.startswith("MB"))


def test_breaks_shows_the_hottest_joint_of_each_place_and_every_joint_on_demand(site, break_study):
    heated = replace(break_study, joints=(SEEN, BLIND))
    short, whole = breaks_text(site, heated), breaks_text(site, heated, everything=True)
    assert "sample 3" in short
    assert "open" not in "".join(hottest_joints((SEEN,), 3)).split("open neutral")[1]
    assert "joint from a milliohm to open" not in short
    assert "joint from a milliohm to open" in whole
    assert [line.split()[0] for line in every_joint((SEEN,))[-2:]] == ["5.04", "open"]
    assert len(short.splitlines()) - len(breaks_text(site, break_study).splitlines()) == 6


def test_a_joint_without_a_solution_is_marked():
    lost = replace(SEEN, states=(replace(SEEN.states[0], points=(replace(HOT, resolved=False), OPEN)),))
    lines = every_joint((lost,))
    assert "?" in lines[-3]
    assert lines[-1] == "? no solution found there"


def test_an_open_joint_and_a_stage_never_reached_are_null_in_json(heated):
    state = study_dict(heated, "relaycfg 0")["joints"][0]["states"][0]
    assert state["points"][-1]["joint_ohm"] is None
    assert [s["joint_ohm"] for s in state["sights"]] == [5.07, 2.58, None, 0.51]
    assert [s["seen"] for s in state["sights"]] == [True, True, False, True]


RELAY = RelayTouch(share(20, 120), share(80, 120), share(20, 120), 12.5, "Workshop", share(0))
LIFTED = PlaceTouch(
    "MB", "PEN", (BoardTouch("MB", 50.0, 183.9, "sample 7", share(120)),), share(120), 2, ("Shed",), RELAY
)
STILL = PlaceTouch("Workshop", "N", (BoardTouch("MB", 50.0, 2.6, "sample 1", share(0)),), share(0), 0, (), None)
TIMES = TouchTimes(((70.0, 1.0), (400.0, 0.04)), "BS 7671", "quoted", "charging points, informative")


def test_touch_volts_name_the_board_the_share_and_what_the_relay_leaves(study):
    lines = touch(replace(study, touch=(LIFTED, STILL), site=replace(study.site, touch=TIMES)))
    (row,) = [line for line in lines if line.startswith("MB")]
    assert "183.9" in row
    assert row.split()[-7:] == ["16.7", "%", "66.7", "%", "16.7", "%", "12.5"]
    text = " ".join(lines)
    assert "no metalwork above its limit (50 V): 1." in text
    assert "2 states without a solution left out" in text
    assert "No PE in the model, so no figure: Shed." in text
    assert "70 V 1 s, 400 V 0.04 s (charging points, informative) [BS 7671; as quoted]" in text
    assert "no protection against electric shock" in text
    assert touch(study) == []


def test_where_nothing_is_lifted_no_table_and_no_times_stand(study):
    text = "\n".join(touch(replace(study, touch=(STILL,), site=replace(study.site, touch=TIMES))))
    assert "In time" not in text
    assert "Workshop" not in text
    assert "no protection against electric shock" in text


def test_the_measuring_choice_shows_both_earths_at_one_pickup(study):
    choice = EarthChoice(
        "local PE", "59N stage 1", 21.5, 0.0, 3.2, (EarthSight("MB", "PEN", 0.0, 142.0, share(0), share(150)),)
    )
    lines = earth_reference(replace(study, earth_choice=choice))
    assert "Earth that N is measured against: local PE" in lines
    (row,) = [line for line in lines if line.startswith("MB")]
    assert row.split()[2:] == ["0.0", "0", "(<", "3/200)", "142.0", "75.0", "%", "(1.0-99.0)"]
    assert "59N stage 1 at 21.5 V" in " ".join(lines)
    assert earth_reference(study) == []
