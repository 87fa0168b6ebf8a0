"""The supply's own displacement is added to what a sound network shows, and to N against PE only behind electrodes."""

from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.cases import Case
from relaycfg.study.evidence import gather
from relaycfg.study.levels import healthy_taps
from tests.study import yard

WELDERS = "".join(yard.load("Main", pair, 4.0, f"welder {pair}", usage=1.0) for pair in ("L1-L2", "L2-L3", "L3-L1"))
"""Nothing to neutral: the network itself displaces nothing, so that 2 percent of 230 V stand alone, 4.6 V."""


def most_unbalanced(folder: Path, earthing: str, percent: float, loads: str = WELDERS) -> Case:
    path = yard.write(folder, earthing=earthing, loads=loads)
    text = path.read_text().replace('band_at = "source"', f'band_at = "source"\ndisplacement_percent = {percent}')
    if earthing == "TT":
        text = text.replace("pe_ohm = [0.02, 0.01]", "").replace("pe_ohm = [0.05, 0.01]", "")
        text = text.replace('name = "Main"\n', 'name = "Main"\nelectrode_ohm = 20\n', 1)
        text = text.replace('name = "Shed"\n', 'name = "Shed"\nelectrode_ohm = 30\n', 1)
    path.write_text(text)
    site = yard.read(folder)
    assert site.relay is not None
    return next(c for c in gather(site, site.relay, 20, 1).cases if c.name.startswith("Most unbalanced"))


def deviation_percent(tap: np.ndarray) -> float:
    """Largest difference of a line from the mean of the lines, over that mean."""
    volts = np.abs(tap[:-1])
    return float(100 * np.abs(volts - volts.mean()).max() / volts.mean())


def tap_of(case: Case, what: str) -> np.ndarray:
    return next(c.segments[0].tap for c in case.courses if c.label.startswith(f"most displaced by {what}"))


@pytest.mark.parametrize(("earthing", "n_pe_v"), [("TN-S", 0.0), ("TT", 4.6)])
def test_a_network_that_displaces_nothing_shows_the_supply_s_own(earthing: str, n_pe_v: float, tmp_path: Path) -> None:
    case = most_unbalanced(tmp_path, earthing, 2.0)
    assert abs(tap_of(case, "V0")[:-1].mean()) == pytest.approx(4.6, abs=1e-6)
    assert abs(tap_of(case, "N-PE")[-1]) == pytest.approx(n_pe_v, abs=1e-6)


@pytest.mark.parametrize("earthing", ["TN-S", "TT"])
def test_it_adds_to_the_network_s_own_displacement_in_its_direction(earthing: str, tmp_path: Path) -> None:
    with_, without = tmp_path / "with", tmp_path / "without"
    with_.mkdir()
    without.mkdir()
    case = most_unbalanced(with_, earthing, 2.0, yard.UNEQUAL)
    bare = most_unbalanced(without, earthing, 0.0, yard.UNEQUAL)
    own_v0 = abs(tap_of(bare, "V0")[:-1].mean())
    assert own_v0 > 0.5
    assert abs(tap_of(case, "V0")[:-1].mean()) == pytest.approx(own_v0 + 4.6, abs=1e-6)
    own_n_pe = abs(tap_of(bare, "N-PE")[-1])
    added = 4.6 if earthing == "TT" else 0.0
    assert abs(tap_of(case, "N-PE")[-1]) == pytest.approx(own_n_pe + added, abs=1e-6)


def test_no_healthy_state_deviates_more_from_line_to_neutral_than_the_course_of_the_highest(tmp_path: Path) -> None:
    # With a supply that adds nothing of its own, against every state the study looked at.
    path = yard.write(tmp_path)
    nothing = 'band_at = "source"\ndisplacement_percent = 0\nunbalance_percent = 0'
    path.write_text(path.read_text().replace('band_at = "source"', nothing))
    site = yard.read(tmp_path)
    assert site.relay is not None
    base = gather(site, site.relay, 20, 1)
    healthy = healthy_taps(site, base.network, base.levels, base.states, "Main")
    case = next(c for c in base.cases if c.name.startswith("Most unbalanced"))
    course = next(c for c in case.courses if c.label.startswith("highest line-to-neutral deviation"))
    highest = max(deviation_percent(tap) for tap in (*healthy.upper, *healthy.lower))
    assert deviation_percent(course.segments[0].tap) == pytest.approx(highest)
