"""Errors a naive tool makes about systems and standards.

In order: split-phase as three lines with a zero, 120/208 V as 240 V, ten-minute means as extremes, the curve for
information equipment as a damage limit, a claim in place of the clause.
"""

import io
import re
from pathlib import Path

import pytest
from pypdf import PdfReader

from relaycfg import __version__
from relaycfg.errors import InputError
from relaycfg.files import templates_dir
from relaycfg.model.device import Function
from relaycfg.model.results import Study
from relaycfg.model.site import Site
from relaycfg.sheet import render
from relaycfg.study import breaks, check, derive, read_board, read_meter
from relaycfg.text import breaks_text, check_text, derive_text, reading_text
from tests.cautions import bench
from tests.study import yard

SPLIT = yard.load("Main", "L1-N", 3.0, "range", 1.0) + yard.load("Main", "L2-N", 1.0, "lamps", 1.0)


def pages(study: Study) -> str:
    """All words of a study's sheet in one line."""
    drawn = PdfReader(io.BytesIO(render(study, templates_dir(), __version__)))
    return " ".join(" ".join(page.extract_text().split()) for page in drawn.pages)


def two_lines(folder: Path, system: str, elements: str) -> Site:
    """The bench on two lines: 3 kW on L1 and 1 kW on L2 at 120 V."""
    supply = f'system = "{system}"\nfrequency_hz = 60'
    return bench.star(folder, SPLIT, nominal_v=120, no_load_v=120, supply=supply, elements=elements)


@pytest.mark.parametrize(("system", "between_v"), [("1ph-3w", 240.0), ("2ph-3w", 120 * 3**0.5)])
def test_treats_split_phase_or_two_lines_of_a_star_as_three_phase_with_a_zero(
    tmp_path: Path, system: str, between_v: float
) -> None:
    """Own arithmetic: 3 kW and 1 kW in series on the volts between the two lines share them 1 to 3.

    A third line at 0 V would stand in the sound supply too.
    """
    site = two_lines(tmp_path, system, yard.OVER.replace("min = 231.0, max = 420.0", "min = 121.0, max = 250.0"))
    seen = bench.at_relay(site)
    assert seen.l_l_v == pytest.approx([between_v], abs=1e-3)
    assert seen.l_n_v == pytest.approx([between_v / 4, 3 * between_v / 4], abs=1e-3)
    high = next(c for c in derive(site, 5, 1).cases if c.name == "Supply at its upper limit")
    assert high.lowest_l_n_v == pytest.approx(high.highest_l_n_v, abs=1e-3)  # no third line at 0 V


def test_treats_split_phase_as_three_phase_with_a_zero(tmp_path: Path) -> None:
    """Own arithmetic: 60 and 180 V in series across 240 V, V0 (180 - 60) / 2 = 60 V.

    With a third channel at zero the sum is divided by three, 40 V; turned to lines 120 degrees apart it is another
    figure again, and "healthy" volts of 120, 120 and 0 V would stand at 40 V. A 59N between 40 and 60 V tells.
    """
    site = two_lines(tmp_path, "1ph-3w", yard.DISPLACEMENT)
    seen = bench.at_relay(site)
    assert seen.l_n_v == pytest.approx((60, 180), abs=1e-3)
    assert seen.l_l_v == pytest.approx((240,), abs=1e-3)
    assert seen.v0_v == pytest.approx(60, abs=1e-3)
    sound = breaks(site, samples=5, seed=1, state="connected", at="none").rows[0].relays["R1"]
    assert sound.v0_v == pytest.approx(0, abs=1e-6)
    for pickup, percent in ((50.0, 100), (62.0, 0)):
        study = check(site, bench.settings(site, bench.stage("displacement", 1, pickup, 0.5)), 5, 1)
        assert [c.seen_percent for c in study.coverage if c.elements == "59N"] == [percent]


def test_treats_two_lines_of_a_star_as_three_phase_with_a_zero(tmp_path: Path) -> None:
    """Own arithmetic: V1 + V2 of a sound 120/208 V service is 120 V: over three that is 40 V, for ever.

    A 59N of the lines is not judged by such a sum: it is left out, no V0 is shown, and the sheet lists it off.
    """
    site = two_lines(tmp_path, "2ph-3w", yard.OVER.replace("231.0", "121.0") + yard.DISPLACEMENT)
    seen = bench.at_relay(site)
    assert seen.l_n_v == pytest.approx((51.96, 155.88), abs=0.01)
    assert seen.v0_v != seen.v0_v
    study = derive(site, 10, 1)
    assert Function.DISPLACEMENT not in {s.function for s in study.settings.active}
    shown = pages(study)
    assert "59N stage 1, 59N stage 2" in shown
    assert "their sum is no displacement" in shown


def test_treats_120_208_as_240_on_two_lines(tmp_path: Path) -> None:
    """Own arithmetic: the two volts of a lost neutral add up to 207.8 V, and to 240 V on split phase alone."""
    for system, between_v in (("2ph-3w", 207.846), ("1ph-3w", 240.0)):
        seen = bench.at_relay(two_lines(tmp_path / system, system, yard.OVER.replace("231.0", "121.0")))
        assert sum(seen.l_n_v) == pytest.approx(between_v, abs=1e-3)
        assert seen.l_l_v == pytest.approx((between_v,), abs=1e-3)
    reading = read_board((120.0, 120.0), (208.0,), "1ph-3w", 120.0)
    assert reading.v0_v is None
    assert reading.causes[0].name == "two lines of a star, not split phase"


def test_treats_a_reading_with_a_zero_as_a_shifted_three_phase_neutral() -> None:
    """120 / 120 / 0 V, as a split-phase board read with three leads: no displacement may be told from it."""
    reading = read_meter((120.0, 120.0, 0.0), None, 120.0)
    assert reading.v0_v is None
    assert reading.causes[0].name == "L3 lost on the supply side"
    assert not any(cause.name.startswith("lost or loose neutral") for cause in reading.causes)


def test_treats_120_208_as_240(tmp_path: Path) -> None:
    """Own arithmetic: 120 sqrt 3 = 207.8 V between lines, and the most a lost neutral brings loads of one angle."""
    loads = bench.shares(6.0, 0.001, 0.001)
    knob = yard.OVER.replace("min = 231.0, max = 420.0", "min = 121.0, max = 250.0")
    site = bench.star(tmp_path, loads, nominal_v=120, no_load_v=120, supply="frequency_hz = 60", elements=knob)
    seen = bench.at_relay(site)
    assert seen.l_l_v == pytest.approx([207.846] * 3, abs=1e-3)
    assert max(seen.l_n_v) == pytest.approx(207.8, abs=0.3)
    for refused in (208.0, 416.0):
        with pytest.raises(InputError, match="looks like a line-to-line voltage"):
            bench.star(tmp_path, loads, nominal_v=refused, no_load_v=refused)


def test_uses_ten_minute_means_as_extremes(tmp_path: Path) -> None:
    """EN 50160 (quoted): 207 to 253 V holds for 95 percent of ten-minute means, 195.5 to 253 V for all of them.

    27 at 205 V trips in a supply at 195.5 V whatever its delay. And means hide what is shorter: 59 at 262 V 2 s
    holds at 253 V for ever, and trips in the swell to 275 V for 3 s.
    """
    site = bench.star(tmp_path, bench.shares(4.0, 4.0, 4.0))
    assert (site.supply.low_v, site.supply.high_v) == pytest.approx((195.5, 253.0))
    low = check(site, bench.settings(site, bench.stage("undervoltage", 1, 205.0, 30.0)), 5, 1)
    assert not low.stages[0].secure
    failed = {c.name for c in low.cases if not c.passed}
    assert "Supply at its lower limit" in failed
    high = check(site, bench.settings(site, bench.stage("overvoltage", 1, 262.0, 2.0, dropout_ratio=0.99)), 5, 1)
    assert next(c for c in high.cases if c.name == "Supply at its upper limit").passed
    assert {c.name for c in high.cases if not c.passed} == {"Swell to 275 V, 3 s"}


def test_names_the_95_percent_band_for_what_it_is(tmp_path: Path) -> None:
    """Where a user takes the band of 95 percent of the week, every page that prints it says so."""
    site = bench.star(tmp_path, supply='band = "EN 50160 95 percent"')
    assert (site.supply.low_v, site.supply.high_v) == pytest.approx((207.0, 253.0))
    assert "95 percent" in site.supply.band_name
    assert any("not for ever" in warning for warning in site.warnings)
    assert "95 percent" in pages(derive(site, 10, 1))


def test_calls_the_curve_for_information_equipment_a_damage_limit_at_230_v(tmp_path: Path) -> None:
    """It is for 120 V equipment and says where that works, not where it breaks: never taken unasked as withstand.

    Asked for at 230 V, the sheet says by its name whose curve it is.
    """
    plain = bench.star(tmp_path / "plain")
    assert "information equipment" not in plain.equipment.name
    assert "ITI" not in plain.equipment.source
    asked = '[equipment]\novervoltage = "information equipment, high side (120 V)"\n'
    site = bench.star(tmp_path / "asked", more=asked)
    assert any("at 230 V it is no limit of damage" in warning for warning in site.warnings)
    shown = pages(derive(site, 10, 1))
    assert "information equipment, high side (120 V)" in shown
    assert "damage limit" not in shown.lower()


CLAIMS = re.compile(
    r"\b(compl(y|ies|iant|iance)|conform(s|ing|ity|ance)?|in accordance with|fulfil\w*|certif\w+|"
    r"meets (the )?(EN|IEC|ANSI|NEMA|standard)|approved to|safe)\b",
    re.IGNORECASE,
)


def test_prints_complies_with_in_place_of_what_was_checked_and_how(tmp_path: Path) -> None:
    """No output claims a standard; every case says where its figures are from and how well that is known."""
    site = yard.site(tmp_path)
    derived = derive(site, 100, 1)
    checked = check(site, derived.settings, 100, 1)
    shown = {
        "derive": derive_text(derived),
        "check": check_text(checked),
        "breaks": breaks_text(site, breaks(site, samples=20, seed=1)),
        "reading": reading_text(read_meter((172.0, 263.0, 263.0), None, 230.0)),
        "sheet": pages(derived),
    }
    for name, text in shown.items():
        assert not CLAIMS.search(text), (name, CLAIMS.search(text))
    for case in derived.cases:
        assert case.source
        assert case.status in ("read", "quoted", "memory", "own", "user", "computed")
    dips = [c for c in derived.cases if c.name.startswith("Dip to")]
    assert len(dips) >= 4
    assert all("IEC 61000-4-11" in c.source and "table" in c.source for c in dips)
    assert "IEC 61000-4-11" in shown["sheet"]
