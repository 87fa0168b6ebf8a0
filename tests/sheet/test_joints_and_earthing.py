"""Pages on loose joints and on earthing: what burns unseen, no shock protection, what the installer has to provide."""

from dataclasses import replace
from io import BytesIO

import pytest
from pypdf import PdfReader

from relaycfg.model.joint_results import EarlyWarning, JointPoint, JointSight, JointState, JointSweep
from relaycfg.model.site import TouchTimes
from relaycfg.model.touch_results import BoardTouch, EarthChoice, EarthSight, PlaceTouch, RelayTouch
from relaycfg.sheet import render


def point(ohm, volts):
    return JointPoint(ohm, volts, volts / ohm, volts**2 / ohm, volts, 230 + volts, True)


POINTS = tuple(point(0.001 * 10**k, 90 * 0.001 * 10**k / (0.001 * 10**k + 5)) for k in range(7))
SIGHTS = (
    JointSight("59 stage 1", True, 5.07, 43.6, 375.0, 401.0, 4.1),
    JointSight("59N stage 1", True, 2.58, 29.45, 336.0, 336.0, 0.8),
    JointSight("27 stage 1", False, None, None, None, 401.0, 1.6),
)
STATE = JointState("sample 17", (*POINTS, point(float("inf"), 90.0)), point(5.0, 45.0), SIGHTS, 336.0)
WARNING = EarlyWarning(8.0, 5.1, 4.6, "case 4", True, "Worth setting, by the engineer's choice: 59N alarm 8.0 V.")
TIMES = TouchTimes(((70.0, 1.0), (400.0, 0.04)), "BS 7671", "quoted", "charging points, informative")


@pytest.fixture(scope="module")
def study(sample):
    plain = sample.study()
    place = plain.site.boards[0].name
    share = sample.share
    sweeps = (
        JointSweep(place, "PEN", (replace(STATE, name="connected"), STATE), share(280), share(80)),
        JointSweep("Workshop", "N", (replace(STATE, sights=(), unseen_w=None),)),
    )
    relay = RelayTouch(share(20, 300), share(250, 300), share(30, 300), 61.5, "Workshop", share(10))
    alike = tuple(BoardTouch(b, 50.0, 151.3, "sample 9", share(300)) for b in (place, "Workshop"))
    touch = (PlaceTouch(place, "PEN", alike, share(300), 3, (), relay),)
    choice = EarthChoice(
        "own electrode", "59N stage 1", 21.5, 0.0, 3.2, (EarthSight(place, "PEN", 0.0, 142.0, share(0), share(301)),)
    )
    site = replace(plain.site, touch=TIMES, relay=replace(plain.site.relay, earth_reference="own electrode"))
    breaks = replace(plain.breaks, joints=sweeps)
    return replace(plain, site=site, breaks=breaks, early_warning=WARNING, touch=touch, earth_choice=choice)


def page_of(study, templates, title):
    """Text from the page with that title up to the end, blanks joined."""
    pages = [" ".join(p.extract_text().split()) for p in PdfReader(BytesIO(render(study, templates, "0.1.0"))).pages]
    start = next(k for k, text in enumerate(pages) if title in text and k > 3)
    return " ".join(pages[start : start + 3])


def test_the_page_on_joints_says_first_that_a_voltage_relay_is_no_hot_joint_detector(study, templates):
    text = page_of(study, templates, "Loose joint in the neutral")
    text = text[text.index("Loose joint in the neutral") :]
    lead = text.index("Each neutral that can break")
    assert text.index("no hot-joint detector") < lead < text.index("no stage picked up First")
    assert "70.0 % (65.3 to 74.3) of the first 400" in text
    assert "336 W 59N stage 1 2.58 ohm 336 W 405 W 5 ohm 45.0 V" in text
    assert "405 W none" in text
    assert "Worth setting, by the engineer's choice" in text


def test_stages_on_the_chart_are_named_with_their_ohms_in_the_table_beside(study, templates):
    text = page_of(study, templates, "Loose joint in the neutral")
    assert text.count("59N stage 1") >= 3
    assert "59 stage 1 5.07 ohm 43.6 V 375 W 401 W 4.10 s" in text
    assert "27 stage 1 – – – 401 W 1.60 s" in text


def test_the_page_on_earthing_says_first_that_it_is_no_shock_protection(study, templates):
    text = page_of(study, templates, "Touch voltage and earthing")
    text = text[text.index("Touch voltage and earthing") :]
    assert text.index("no protection against electric shock") < text.index("151.3 V")
    assert "6.7 % 83.3 % 10.0 %" not in text
    assert "10.0 % 83.3 % 6.7 % 61.5 V Workshop" in text
    assert "3 states without a solution left out" in text
    assert "70 V 1 s, 400 V 0.04 s" in text


def test_boards_with_the_same_volts_share_a_row(study, templates):
    text = page_of(study, templates, "Touch voltage and earthing")
    assert f"{study.site.boards[0].name}, Workshop 151.3 V 50.0 V 75.0 %" in text


def test_the_installer_is_told_what_an_electrode_of_its_own_takes(study, templates):
    text = page_of(study, templates, "Touch voltage and earthing")
    assert "outside the influence of every other electrode" in text
    assert "tied to neither PE nor N nor metalwork" in text
    card = " ".join(PdfReader(BytesIO(render(study, templates, "0.1.0"))).pages[1].extract_text().split())
    assert "N is measured against an electrode of the relay's own" in card
    local = replace(study, site=replace(study.site, relay=replace(study.site.relay, earth_reference="local PE")))
    card = " ".join(PdfReader(BytesIO(render(local, templates, "0.1.0"))).pages[1].extract_text().split())
    assert "electrode of the relay's own" not in card


def test_page_one_says_how_high_metalwork_may_stand_and_what_a_joint_may_burn(study, sample, templates):
    first = " ".join(PdfReader(BytesIO(render(study, templates, "0.1.0"))).pages[0].extract_text().split())
    board = study.site.boards[0].name
    assert f"Metalwork of {board} may stand at up to 151.3 V to remote earth (PEN break at {board})" in first
    assert "above 50 V in 75.0 % of the load states; this relay is no protection against electric shock." in first
    assert f"A loose joint in the neutral may burn up to 336 W and no stage trips ({board})." in first
    plain = " ".join(PdfReader(BytesIO(render(sample.study(), templates, "0.1.0"))).pages[0].extract_text().split())
    assert "Metalwork of" not in plain
    assert "A loose joint" not in plain


def test_without_joints_and_touch_volts_the_pages_say_so(sample, templates):
    text = " ".join(
        " ".join(p.extract_text().split()) for p in PdfReader(BytesIO(render(sample.study(), templates, "0.1.0"))).pages
    )
    assert "No joint was swept." in text
    assert "No touch voltage was computed." in text
