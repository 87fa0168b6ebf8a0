"""The sheet of a system with two lines: its plane, its card, and words that speak of two lines only."""

import io
from dataclasses import replace

import numpy as np
import pytest
from pypdf import PdfReader

from relaycfg import __version__
from relaycfg.files import templates_dir
from relaycfg.model.device import Function
from relaycfg.sheet import render
from relaycfg.sheet.plane import rings, upright
from relaycfg.study import derive
from tests.study import two_lines

SYSTEMS = ("1ph-3w", "2ph-3w")


@pytest.fixture(scope="module")
def studies(tmp_path_factory):
    """A derived study of each system."""
    folder = tmp_path_factory.mktemp("two lines")
    return {system: derive(two_lines.site(folder / system, system), 100, 1) for system in SYSTEMS}


@pytest.fixture(scope="module")
def pages(studies):
    """Words of each page of each sheet."""
    drawn = {s: PdfReader(io.BytesIO(render(study, templates_dir(), __version__))) for s, study in studies.items()}
    return {s: [" ".join(page.extract_text().split()) for page in pdf.pages] for s, pdf in drawn.items()}


@pytest.mark.parametrize(("system", "below_v"), [("1ph-3w", 0.0), ("2ph-3w", 60.0)])
def test_two_lines_stand_on_one_level_with_the_sound_neutral_between_or_below_them(studies, system, below_v):
    """Source: own arithmetic: corners 120 V from N; of a star they lie U0/2 above it, on either side by half of U12."""
    study = studies[system]
    first, second = 120 * upright(study) * study.site.supply.geometry.phasors
    across = study.site.supply.geometry.line_to_line_ratio * 60
    assert (first.real, second.real) == pytest.approx((-across, across))
    assert (first.imag, second.imag) == pytest.approx((below_v, below_v), abs=1e-9)


def test_a_neutral_is_drawn_at_its_lines_volts_from_each_corner(studies):
    """The distance of a mark from a corner is that line's volts, in the break states of both systems."""
    for study in studies.values():
        emf = study.site.source.emf_v * study.site.supply.geometry.phasors
        worst = study.breaks.summaries[0]
        assert study.plane
        volts = [np.abs(emf + point.v0) for point in study.plane]
        assert max(float(v.max()) for v in volts) <= worst.percentiles[0].largest + 1.0
        sums = [float(v.sum()) for v in volts]
        between = abs(emf[0] - emf[1])
        # Resistive loads leave the neutral on the straight line: the two volts add up to those between the lines.
        assert sums == pytest.approx([between] * len(sums), rel=0.02)


def test_the_circle_of_a_sum_of_two_legs_has_half_its_radius(studies):
    """Source: own arithmetic: the sum of two lines is twice V0."""
    study = studies["1ph-3w"]
    radius = {f: r for f, _, r in rings(study)}[Function.DISPLACEMENT]
    doubled = tuple(
        replace(r, stage=replace(r.stage, quantity="3v0")) if r.stage.function is Function.DISPLACEMENT else r
        for r in study.stages
    )
    assert {f: r for f, _, r in rings(replace(study, stages=doubled))}[Function.DISPLACEMENT] == pytest.approx(
        radius / 2
    )


def test_no_circle_of_displacement_is_drawn_where_there_is_none(studies):
    assert Function.DISPLACEMENT not in {function for function, _, _ in rings(studies["2ph-3w"])}


@pytest.mark.parametrize("system", SYSTEMS)
def test_page_1_names_the_system_and_the_volts_between_its_lines(pages, system):
    first = pages[system][0]
    name, between = {"1ph-3w": ("split phase", "240.0"), "2ph-3w": ("two lines of a star", "207.8")}[system]
    assert f"{name}, 120.0 V line to neutral, {between} V between lines" in first
    assert "Prepared" in first
    assert ("balanced load shifts nothing" in first) == (system == "1ph-3w")
    assert pages[system][1].count("What a trip means") == 1


def test_the_card_says_what_v0_of_two_legs_is_and_which_element_stays_off(pages):
    assert "half the difference of the two lines, not their sum" in pages["1ph-3w"][1]
    off = pages["2ph-3w"][1].partition("OFF: ")[2].partition("Sensing point")[0]
    assert "59N stage 1, 59N stage 2" in off
    for system in SYSTEMS:
        assert "a low reading means a lost line" in pages[system][1]


@pytest.mark.parametrize("system", SYSTEMS)
def test_no_word_of_a_third_line_stands_anywhere(pages, system):
    whole = " ".join(pages[system]).replace("supply.phase_order L1-L2-L3", "")  # the order of the star they are of
    for word in ("L3", "all three", "two others", "1 : 1", "– V.", "nan"):
        assert word not in whole, word


def test_the_record_asks_for_no_displacement_where_there_is_none(pages):
    one, two = (" ".join(pages[s]) for s in SYSTEMS)
    assert "On load: standing displacement V0" in one
    assert "On load: volts between the lines" in two
    assert "standing displacement V0" not in two
