"""Charts: axes that keep every point, staircases that mean what they say, labels apart, circles of the right size."""

from dataclasses import replace
from io import BytesIO

import pytest
from reportlab.pdfgen.canvas import Canvas

from relaycfg.model.device import Function
from relaycfg.sheet import fonts
from relaycfg.sheet.chart import Axes, Labels
from relaycfg.sheet.corridors import _axes, _operating, _region, _staircase
from relaycfg.sheet.plane import rings

BOX = (0.0, 0.0, 400.0, 200.0)


@pytest.fixture
def axes():
    return Axes.around(BOX, [0.05, 4.0, None], [250.0, 320.0])


@pytest.fixture
def canvas():
    fonts.register()
    return Canvas(BytesIO(), initialFontName=fonts.SANS)


def test_axes_hold_all_points_and_time_runs_to_the_right(axes):
    places = [axes.across(t) for t in (0.05, 0.5, 4.0, None)]
    assert places == sorted(places)
    assert places[0] > 0
    assert places[-1] < 400
    assert 0 < axes.up(250) < axes.up(320) < 200


def test_a_tenfold_time_is_the_same_way_everywhere(axes):
    assert axes.across(1.0) - axes.across(0.1) == pytest.approx(axes.across(10.0) - axes.across(1.0))


def test_ticks_are_few_and_within_the_axis(axes):
    assert 3 <= len(axes.ticks) <= 9
    assert all(axes.low <= t <= axes.high for t in axes.ticks)


def test_stages_together_never_grow_slower_with_severity(sample):
    stages = [r for r in sample.stages() if r.stage.function is Function.OVERVOLTAGE]
    assert _operating(stages, Function.OVERVOLTAGE) == [(4.1, 266.8), (1.5, 282.9), (0.35, 308.2)]
    slow = [replace(r, stage=replace(r.stage, delay_s=5.0)) if r.stage.number == 3 else r for r in stages]
    assert _operating(slow, Function.OVERVOLTAGE)[-1] == (1.5, 308.2)


def test_undervoltage_is_severe_downward(sample):
    first = next(r for r in sample.stages() if r.stage.function is Function.UNDERVOLTAGE)
    second = replace(first, stage=replace(first.stage, number=2, pickup=140.0, delay_s=0.4))
    assert _operating([second, first], Function.UNDERVOLTAGE) == [(1.5, 177.1), (0.4, 140.0)]


def test_what_must_be_ridden_through_reaches_from_the_mild_edge_to_the_severe_one(axes):
    corners = _region(axes, [(None, 255.0), (2.0, 261.0)], axes.low, axes.high)
    assert corners[0] == (0.0, 0.0)
    assert (400.0, axes.up(261.0)) in corners
    assert corners[-2:] == [(axes.across(2.0), 200.0), (0.0, 200.0)]


def test_a_staircase_comes_in_from_the_right_at_its_first_level(axes):
    points = _staircase(axes, [(4.0, 260.0), (0.5, 300.0)], axes.high)
    assert points[0] == (400.0, axes.up(260.0))
    assert points[-1] == (axes.across(0.5), 200.0)


def test_labels_keep_apart_or_stay_out(canvas):
    labels = Labels(BOX)
    placed = [labels.place(canvas, 200.0 + k % 3, 100.0 + k % 2, f"{k}, {k + 1}") for k in range(60)]
    assert placed[0]
    assert not placed[-1]
    boxes = labels.taken
    for k, a in enumerate(boxes):
        for b in boxes[k + 1 :]:
            assert a[2] <= b[0] or b[2] <= a[0] or a[3] <= b[1] or b[3] <= a[1]


def test_a_label_keeps_off_a_line(canvas):
    free, ruled = Labels(BOX), Labels(BOX)
    ruled.block_line([(200.0, 100.0), (400.0, 100.0)])
    free.place(canvas, 200.0, 100.0, "59 / 1")
    ruled.place(canvas, 200.0, 100.0, "59 / 1")
    assert free.taken[-1][0] > 200
    assert ruled.taken[-1][2] < 200


def test_no_label_is_struck_through_by_the_line_to_another(canvas):
    labels = Labels(BOX)
    for k in range(14):
        labels.block(200.0 + 2 * k, 100.0)
    for k in range(14):
        labels.place(canvas, 200.0 + 2 * k, 100.0, f"{k}")
    beads = [box for box in labels.taken if box[2] - box[0] < 1]
    assert beads
    for word in labels.written:
        for bead in beads:
            apart = bead[2] <= word[0] or word[2] <= bead[0] or bead[3] <= word[1] or word[3] <= bead[1]
            assert apart


def test_the_volts_axis_of_27_fits_its_settings_and_leaves_deep_cases_beyond(sample):
    corridor = next(c for c in sample.corridors() if c.function is Function.UNDERVOLTAGE)
    stages = [r for r in sample.stages() if r.stage.function is Function.UNDERVOLTAGE and r.stage.on]
    axes = _axes(BOX, corridor, stages, 230.0)
    assert 90 < axes.low < 115
    assert 253 < axes.high < 275
    assert [c.case for c in corridor.cases if not axes.holds(c.pickup)] == [6, 7, 10]
    low = [replace(r, stage=replace(r.stage, pickup=80.0)) for r in stages]
    assert _axes(BOX, corridor, low, 230.0).holds(80.0)


def test_a_case_without_seconds_would_not_reset(lines):
    text = "\n".join("\n".join(page) for page in lines["plain"])
    assert "case 195.5 V would not reset case 2, supply at its lower limit" in text
    assert "ride-through 200.0 V for ever case 2" in text


def test_the_plane_says_which_states_it_shows_and_what_its_corners_are(lines):
    text = " ".join(" ".join(page) for page in lines["plain"])
    assert "at its no-load volts, 242.0 V" in text
    assert "up to 80 states of each place seen, those not cleared in time first, at nominal supply" in text


def test_the_plane_counts_each_state_in_one_class(lines, sample):
    points = sample.study().plane
    text = "\n".join("\n".join(page) for page in lines["plain"])
    undetected = sum(p.harm == "none" and p.operation == "none" for p in points)
    left = sum(p.harm != "none" and p.operation != "in time" for p in points)
    assert f"no harm, no operation: undetected {undetected}\n" in text
    assert f"harm, late or not cleared {left}\n" in text


def test_circles_are_the_most_sensitive_pickups(sample):
    found = rings(sample.study())
    radii = {function: {r for f, _, r in found if f is function} for function, _, _ in found}
    assert radii == {Function.OVERVOLTAGE: {266.8}, Function.UNDERVOLTAGE: {177.1}, Function.DISPLACEMENT: {21.5}}
    centres = [c for f, c, _ in found if f is Function.OVERVOLTAGE]
    assert sum(centres) == pytest.approx(0, abs=1e-9)
    assert abs(centres[0] - centres[1]) == pytest.approx(242 * 3**0.5)


def test_a_pickup_in_three_times_v0_draws_a_third(sample):
    study = sample.study()
    stages = tuple(
        replace(r, stage=replace(r.stage, quantity="3v0")) if r.stage.function is Function.DISPLACEMENT else r
        for r in study.stages
    )
    found = rings(replace(study, stages=stages))
    assert [r for f, _, r in found if f is Function.DISPLACEMENT] == [pytest.approx(21.5 / 3)]


def test_an_element_on_line_to_line_volts_draws_no_circle(sample):
    study = sample.study()
    stages = tuple(
        replace(r, stage=replace(r.stage, quantity="l-l")) if r.stage.function is Function.OVERVOLTAGE else r
        for r in study.stages
    )
    assert Function.OVERVOLTAGE not in {f for f, _, _ in rings(replace(study, stages=stages))}


def test_stages_that_need_all_lines_draw_no_circle(sample):
    study = sample.study()
    stages = tuple(replace(r, stage=replace(r.stage, phases="all")) for r in study.stages)
    assert rings(replace(study, stages=stages)) == []
