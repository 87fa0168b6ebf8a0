"""Must-hold cases show the tap what the case's own definition says."""

from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.cases import Case
from relaycfg.study import derive
from relaycfg.study.evidence import gather
from tests.study import yard


@pytest.fixture(scope="module")
def cases(tmp_path_factory: pytest.TempPathFactory) -> tuple[Case, ...]:
    site = yard.site(tmp_path_factory.mktemp("yard"))
    assert site.relay is not None
    return gather(site, site.relay, 50, 1).cases


def named(cases: tuple[Case, ...], start: str) -> Case:
    return next(c for c in cases if c.name.startswith(start))


@pytest.mark.parametrize(("start", "v0"), [("Dip to 80 %", 15.33), ("Dip to 70 %", 23.0), ("Dip to 40 %", 46.0)])
def test_dips_on_one_or_two_lines_displace_the_neutral_and_delta_star_dips_do_not(
    cases: tuple[Case, ...], start: str, v0: float
) -> None:
    # Own arithmetic: (1 - h) U0 / 3 for types B and E; types C and D have no zero sequence (Bollen, from memory).
    found = {c.label: abs(c.segments[0].tap[:-1].mean()) for c in named(cases, start).courses}
    assert found["one line"] == pytest.approx(v0, abs=0.01)
    assert found["two lines"] == pytest.approx(v0, abs=0.01)
    assert found["all lines"] == pytest.approx(0, abs=1e-9)
    assert found["through delta-star, type C"] == pytest.approx(0, abs=1e-9)
    assert found["through delta-star, type D"] == pytest.approx(0, abs=1e-9)


def test_type_d_leaves_the_residual_on_one_line_and_type_c_leaves_one_line_sound(cases: tuple[Case, ...]) -> None:
    # Own arithmetic on the definitions: D has h on one line and sqrt(h^2 + 3) / 2 on the others, C the reverse part.
    courses = {c.label: np.abs(c.segments[0].tap[:-1]) for c in named(cases, "Dip to 40 %").courses}
    d, c = courses["through delta-star, type D"], courses["through delta-star, type C"]
    assert d == pytest.approx([92.0, *[230 * np.sqrt(0.4**2 + 3) / 2] * 2], abs=1e-6)
    assert c == pytest.approx([230.0, *[230 * np.sqrt(1 + 3 * 0.4**2) / 2] * 2], abs=1e-6)


def test_an_open_sensing_fuse_reads_a_third_of_the_voltage_as_displacement(cases: tuple[Case, ...]) -> None:
    case = named(cases, "Sensing fuse open")
    assert case.expect == "either"
    assert abs(case.courses[0].segments[0].tap[:-1].mean()) == pytest.approx(230 / 3)


def test_with_balanced_load_the_tap_stays_inside_the_band_of_the_source(tmp_path: Path) -> None:
    # EN 50160, all ten-minute means, as quoted: 195.5 to 253 V; the network's drop comes on top.
    site = yard.site(tmp_path, loads=yard.BALANCED)
    assert site.relay is not None
    found = gather(site, site.relay, 50, 1).cases
    upper = np.abs(named(found, "Supply at its upper").courses[0].segments[0].tap[:-1])
    lower = np.abs(named(found, "Supply at its lower").courses[0].segments[0].tap[:-1])
    assert 252.0 < upper.max() < 253.0
    assert 193.0 < lower.min() < 195.5


def test_unequal_load_lifts_a_line_above_the_band_of_the_source(cases: tuple[Case, ...]) -> None:
    # The neutral conductor's drop displaces the board's neutral; the lightest line rises by it (own arithmetic).
    case = named(cases, "Supply at its upper")
    tap = case.courses[0].segments[0].tap[:-1]
    assert 253.0 < np.abs(tap).max() < 253.0 + 3 * abs(tap.mean())


def test_a_short_circuit_pairs_its_own_clearing_time(cases: tuple[Case, ...]) -> None:
    case = named(cases, "Short circuit behind Main")
    assert {s.duration_s for c in case.courses for s in c.segments} == {0.1}
    near = next(c for c in case.courses if c.label.startswith("L-N near"))
    assert np.abs(near.segments[0].tap[0]) < 1e-3


def test_cases_are_numbered_in_order(cases: tuple[Case, ...]) -> None:
    assert [c.number for c in cases] == list(range(1, len(cases) + 1))


def test_a_user_case_is_played_as_given(tmp_path: Path) -> None:
    own = """
[[case]]
name = "Crane slews"
expect = "hold"
source = "invented"
[[case.segment]]
duration_s = 0.8
l_n_v = [214.0, 226.0, 231.0]
"""
    site = yard.site(tmp_path, more=own)
    assert site.relay is not None
    case = gather(site, site.relay, 10, 1).cases[-1]
    assert case.name == "Crane slews"
    assert np.abs(case.courses[0].segments[0].tap[:-1]) == pytest.approx([214.0, 226.0, 231.0])


def test_no_standing_case_leaves_the_limits_of_the_supply(cases: tuple[Case, ...]) -> None:
    # Unbalance lies inside the band, not on top of it: the extremes are those of the two limits.
    lowest = np.abs(named(cases, "Supply at its lower").courses[0].segments[0].tap[:-1]).min()
    highest = np.abs(named(cases, "Supply at its upper").courses[0].segments[0].tap[:-1]).max()
    for course in named(cases, "Most unbalanced").courses:
        volts = np.abs(course.segments[0].tap[:-1])
        assert lowest - 1e-6 <= volts.min()
        assert volts.max() <= highest + 1e-6


def test_the_supplys_own_displacement_stands_where_the_loads_bring_none(tmp_path):
    """Source: own arithmetic: 2 percent of 230 V are 4.6 V; a perfectly balanced load leaves V0 at rounding noise."""
    path = yard.write(tmp_path, loads=yard.BALANCED)
    path.write_text(path.read_text().replace('band_at = "source"', 'band_at = "source"\ndisplacement_percent = 2'))
    assert derive(yard.read(tmp_path), 5, 1).displacement_standing_v == pytest.approx(4.6)
