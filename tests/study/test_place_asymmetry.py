"""The smallest asymmetry each element sees at a place, against Millman's theorem worked by hand."""

from dataclasses import replace
from pathlib import Path

import pytest

from relaycfg.model.site import Site
from relaycfg.study.asymmetry import smallest_asymmetry
from relaycfg.study.evidence import gather
from relaycfg.study.place_asymmetry import place_asymmetries
from relaycfg.study.settle import settle
from relaycfg.study.stages import active_stages
from tests.study.test_highest_voltage import stiff
from tests.study.yard import load, site

SMALL = "".join(load("Main", f"L{k + 1}-N", kw, f"load {k}", usage=0.5) for k, kw in enumerate((6.0, 4.0, 2.0)))
MEAN_W = 0.5 * 12_000


def found(made: Site) -> tuple[dict[str, dict[str, float | None]], dict[str, float | None], float]:
    """Ratios by place, those of a stiff source, and the least sensitive pickup of 59N [V]."""
    assert made.relay is not None
    evidence = gather(made, made.relay, 200, 1)
    stages = active_stages(evidence, settle(evidence).settings)
    pickup = min(s.insensitive.pickup for s in stages if s.function.value == "59N")
    places = place_asymmetries(evidence, stages)
    assert [p.load_w for p in places] == [pytest.approx(MEAN_W)] * len(places)
    return {p.at: p.ratios for p in places}, smallest_asymmetry(evidence, stages), pickup


def test_without_impedances_every_place_sees_what_the_stiff_source_shows(tmp_path: Path) -> None:
    places, behind_stiff, pickup = found(stiff(site(tmp_path, loads=SMALL)))
    assert set(places) == {"source", "Main"}
    for ratios in places.values():
        assert ratios == {name: pytest.approx(k, rel=2e-3) for name, k in behind_stiff.items()}
        # V0 = U (k - 1) / (k + 2) of conductances k:1:1 (Millman), so k = (U + 2 p) / (U - p).
        assert ratios["59N"] == pytest.approx((230 + 2 * pickup) / (230 - pickup), rel=1e-3)


def test_an_electrode_leads_displacement_away_and_a_larger_asymmetry_is_needed(tmp_path: Path) -> None:
    """V0 = U G (k - 1) / ((k + 2) (G + Yp)): G all conductance behind the break, Yp = 1 / (2 + 5) ohm of electrodes."""
    made = stiff(site(tmp_path, loads=SMALL, earthing="TN-C-S"))
    boards = tuple(replace(b, electrode_ohm=5.0) if b.neutral_earth_link else b for b in made.boards)
    made = replace(made, boards=boards, source=replace(made.source, earth_at="star-point", neutral_ohm=1e-6 + 0j))
    places, _, pickup = found(made)
    conductance = MEAN_W / 230**2
    needed = pickup * (1 + 1 / 7 / conductance) / 230
    assert places["Main"]["59N"] == pytest.approx((1 + 2 * needed) / (1 - needed), rel=2e-3)
    assert places["Main"]["59N"] > 1.2 * (230 + 2 * pickup) / (230 - pickup)


def test_a_place_without_load_to_the_neutral_has_no_asymmetry(tmp_path: Path) -> None:
    made = site(tmp_path, loads=load("Main", "L1-L2", 4.0, "welder"))
    assert made.relay is not None
    evidence = gather(made, made.relay, 50, 1)
    assert place_asymmetries(evidence, ()) == ()
