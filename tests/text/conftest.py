"""Results built by hand, small enough to read: one seen break place, one unseen, one stage of 59 and an OFF 27."""

from dataclasses import replace

import pytest

from relaycfg.model import break_results as b
from relaycfg.model import results as r
from relaycfg.model.device import Accuracy, Device, Element, Function, SettableRange
from relaycfg.model.geometry import three_phase
from relaycfg.model.settings import Settings, Stage
from relaycfg.model.site import (
    Board,
    Cable,
    Document,
    Equipment,
    Feed,
    Input,
    ReferenceCases,
    Relay,
    Site,
    Source,
    Supply,
)


@pytest.fixture
def device():
    element = Element(
        Function.OVERVOLTAGE,
        2,
        SettableRange(240, 300, 1),
        "v",
        None,
        SettableRange(0.05, 30, 0.01),
        (0.97,),
        ("instantaneous",),
        0.0,
        Accuracy(1.0, 1.0, 1.0, 0.03, "greater"),
        "l-n",
        knob="U>",
    )
    return Device("Trial relay", ("l-n",), "rms", 1.0, 0.5, "per phase", "l-n", (element,))


@pytest.fixture
def site(device):
    cable = Cable(0.1, 0.1, None, 0.1, 0.1, None)
    feed = Feed("L1-L2", 300, 460)
    relay = Relay("R1", "MB", "MB", "lines and neutral", device, feed, "shunt", feed, 0.01, 0.05)
    inputs = (
        Input("supply.nominal_v", "230", "V", "measured", ""),
        Input("supply.unbalance_percent", "2", "%", "default", ""),
        Input("board.MB.electrode_ohm", "20", "ohm", "assumed", ""),
    )
    return Site(
        Document("Voltage relay settings", "NY-1", "A", "draft", "", "North yard", "A4", ""),
        Supply(three_phase(), 230, 50, "TN-S", 195.5, 253, "band", "", "read", "MB", 2, 0),
        Source("grid", "impedance", 230, 0.01, 0.01, 0.0001, None, "neutral-bar"),
        (Board("MB", "source", cable, False, None), Board("Workshop", "MB", cable, False, None)),
        (),
        (),
        (),
        relay,
        Equipment(253, 15, ((276.0, 15.0),), None, 0, (), "", "", ""),
        ReferenceCases((), (), 0.3, "", ""),
        (),
        inputs,
        (),
        "sha256:abc",
    )


def volts(*l_n_v):
    return b.BoardVolts(l_n_v, (0.0, -120.0, 120.0), (398.0, 398.0, 398.0), 57.5, None, 12.0, None)


def row(at, state, l_n_v=(172.5, 263.5, 263.5), joint_ohm=None):
    unbalance = {"l_n_deviation": 26.0, "l_l_deviation": 0.0, "v2_v1": 0.0, "spread": 39.0}
    relay = b.RelayVolts(l_n_v, (398.0, 398.0, 398.0), 57.5, None, unbalance)
    boards = {"MB": volts(*l_n_v), "Workshop": volts(*(v + 1 for v in l_n_v))}
    companion = b.BreakRow(at, "N", joint_ohm, state, "converged", (), 0, 57.5, 0, {"R1": relay}, boards, None)
    return replace(companion, flags=("below band",), all_impedance=companion)


def share(count, of=200):
    return b.Share(count, of, 0.01, 0.99)


def summary(at, seen):
    why = "" if seen else "the break is not upstream of the relay's tap at MB"
    percentiles = (b.Percentiles("highest line-to-neutral, any board", "V", 231, 266, 301.2, 344.4),)
    worst = (b.WorstState(17, "Workshop", "L2", 344.4, 5),)
    classes = {"high volts / in time": share(120), "high volts / late": share(3), "none / none": share(77)}
    sights = (b.ElementSight(Function.OVERVOLTAGE, share(123), 0.2),)
    away = () if seen else ("Workshop",)
    return b.PlaceSummary(
        at, "N", seen, why, 200, 1, {"unstable": 0}, classes, share(123), share(77 if seen else 0),
        percentiles, worst, sights, ("MB", "Workshop"), (), away, 12.0,
    )  # fmt: skip


@pytest.fixture
def break_study():
    return b.BreakStudy(
        (row("MB", "connected"), row("Workshop", "connected"), row("MB", "least")),
        (summary("MB", True), summary("Workshop", False)),
        1,
        2,
        ("break at MB, state least: V0 0.1 V, the load is balanced; not detectable by any voltage element",),
    )


def stage_result(function=Function.OVERVOLTAGE, number=1, on=True, **changes):
    stage = Stage(function, number, on, 265.0, 4.0, 0.97, quantity="l-n")
    bound = r.Bound("pickup", "not below", 261.0, "V", "case 1, upper limit", "253 / 0.97 / 0.99", "EN 50160")
    margins = r.Margins(4.0, 1.5, 1.7, "case 1, upper limit", 11.0, None, 2.2, "break at MB")
    figures = r.StageResult(
        stage, 115.2, "230 V line to neutral",
        265.0, "V", 262.4, 267.7, 4.13, True, (bound,), margins, 49.5, "slow step"
    )  # fmt: skip
    return replace(figures, **changes)


def case(number, passed):
    operated = () if passed else (r.Operated("27 stage 1", 0.15, "all lines"),)
    return r.CaseResult(
        number, "three-phase dip", "hold", "hold" if passed else "trip", passed, "to 40 % for 0.2 s", "IEC 61000-4-11",
        "quoted", operated, 230.0, 92.0, 0.0, 20.0, 0.3, "59 stage 1", "27 stage 1, never resets",
    )  # fmt: skip


@pytest.fixture
def study(site, device, break_study):
    off = stage_result(
        Function.UNDERVOLTAGE, on=False, bounds=(), margins=None, clears_percent=None, reason="it adds nothing here"
    )
    stages = (stage_result(), off)
    steps = (
        r.CurveStep(250.0, None, "case 1, upper limit"),
        r.CurveStep(262.0, 5.0, "case 4, swell", 4),
        r.CurveStep(263.0, 5.0, "case 4, swell", 4),
        r.CurveStep(280.0, 0.5, "case 5, swell", 5),
    )
    corridor = r.Corridor(Function.OVERVOLTAGE, "V", steps, (), steps[:1], 253.0, "case 1, upper limit")
    found = (
        r.Finding("exception", "27 stage 1", "case 2 fails", "turn U< from 207 to 182 V", "it trips in common dips"),
        r.Finding("warning", "input_digest", "the settings were derived from other inputs", "derive again", ""),
        r.Finding("note", "", "one input is a default", "", ""),
    )
    group = r.ClosedGroup({"59": "case 4"}, 3, True, "MB", 281.0, 4.0, None, "3 scenarios are closed by case 4")
    settings = Settings("R1", device.name, "sha256:abc", tuple(s.stage for s in stages), 0.5, "automatic", 5.0)
    volts_v = (172.5, 263.5, 263.5)
    worked = r.WorkedBreak("MB", "connected", (0.2 + 0j, 0.1 + 0j, 0.1 + 0j), 0j, 230.0, 57.5 + 0j, volts_v, volts_v)
    return r.Study(
        site, device, "check", 1, 200, settings,
        stages, (case(1, True), case(2, False)), break_study, (corridor,), (group,), 7, 3, found,
        (r.TestPoint("59 stage 1", "L1", "250 to 270 V", "trip", 262.4, 267.7, "V", ""),), worked,
        (r.PlanePoint(57.5 + 3j, "high volts", "in time"),), 3.2, (("supply", 300.0, 344.0),),
        {"59": 2.04, "47": None}, (r.Cover("59", 97.6, 61.5), r.Cover("47", None, 0.0)), "sha256:abc",
    )  # fmt: skip
