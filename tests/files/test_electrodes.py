"""Electrodes of rods and soil, and touch limits, as a site states them."""

import math

import pytest

from relaycfg.errors import InputError
from relaycfg.files import read_site
from relaycfg.files.resolve_electrode import group_ohm, rod_ohm
from tests.files import sweep

ROD = "electrode = { rod_length_m = 3, rod_diameter_mm = 25, soil_ohm_m = 55 }"
BARN = '[[board]]\nname = "Barn"\nfed_from = "MB"\n'


def site(folder, more="", source=""):
    return sweep.read_bare(folder, sweep.bare(more=more, source=sweep.TRANSFORMER + source))


def problems(folder, electrode):
    with pytest.raises(InputError) as caught:
        site(folder, f"{BARN}{electrode}\n")
    return str(caught.value)


def test_a_rod_has_the_ohms_of_the_published_formula(tmp_path):
    """Source: worked example citing BS 7430: 3 m, 25 mm, 55 ohm m: 17.12 ohm (17.118 by hand)."""
    assert site(tmp_path, BARN + ROD).board("Barn").electrode_ohm == pytest.approx(17.12, abs=0.005)


def test_the_source_may_have_rods_too(tmp_path):
    """Source: the same; it takes the place of the default."""
    read = site(tmp_path, source=f"\n{ROD}")
    assert read.source.electrode_ohm == pytest.approx(17.12, abs=0.005)
    assert not any("electrode_ohm" in i.field for i in read.inputs)


def test_two_rods_in_line_take_the_factor_of_the_table_and_say_so(tmp_path):
    """Source: BS 7430 as quoted, lambda 1: R (1 + a) / 2 with a = 55 / (2 pi 17.118 10) = 0.0511."""
    read = site(tmp_path, BARN + ROD.replace(" }", ", rods = 2, spacing_m = 10 }"))
    assert read.board("Barn").electrode_ohm == pytest.approx(17.118 * 1.0511 / 2, abs=0.002)
    (factor,) = [i for i in read.inputs if i.field.endswith("group_factor")]
    assert (factor.tag, factor.value, factor.status) == ("default", "1", "quoted")


def test_a_group_is_never_worth_more_than_its_rods_apart():
    """Source: physics: rods in each other's field carry less; far apart they are n in parallel."""
    one = rod_ohm(2.4, 0.016, 100)
    assert group_ohm(one, 4, 3.0, 100, 2.0) > one / 4
    assert group_ohm(one, 4, 1e9, 100, 2.0) == pytest.approx(one / 4)
    assert rod_ohm(2.4, 0.016, 200) == pytest.approx(2 * one)
    assert one == pytest.approx(100 / (2 * math.pi * 2.4) * (math.log(4 * 2.4 / 0.016) - 0.3069), rel=1e-4)


@pytest.mark.parametrize(
    ("electrode", "said"),
    [
        (f"electrode_ohm = 10\n{ROD}", "keep one of them"),
        (ROD.replace("= 25", "= 400").replace("= 3,", "= 0.3,"), "no less than its length"),
        (ROD.replace(" }", ", rods = 2 }"), "spacing_m is missing; give it for 2 rods"),
        (ROD.replace(" }", ", rods = 3, spacing_m = 5 }"), "group_factor is missing; give it for 3 rods"),
        (ROD.replace(" }", ", spacing_m = 5 }"), "not used by one rod"),
        (ROD.replace(" }", ", rods = 2, spacing_m = 0.01 }"), "no more than the diameter of a rod"),
        ("electrode = { rod_length_m = 3, soil_ohm_m = 55 }", "rod_diameter_mm is missing"),
    ],
)
def test_what_does_not_hold_of_an_electrode_is_told(tmp_path, electrode, said):
    assert said in problems(tmp_path, electrode)


def test_boards_without_a_limit_of_their_own_share_one_default(tmp_path):
    """Source: conventional touch voltage limit 50 V, IEC 60364-4-41 as quoted."""
    read = site(tmp_path, f"{BARN}touch_limit_v = 25\n")
    assert {b.name: b.touch_limit_v for b in read.boards} == {"MB": 50.0, "Barn": 25.0}
    limits = [(i.field, i.tag, i.value, i.status) for i in read.inputs if i.field.endswith("touch_limit_v")]
    assert limits == [
        ("board.Barn.touch_limit_v", "assumed", "25", ""),
        ("board.touch_limit_v", "default", "50", "quoted"),
    ]


def test_a_tt_site_whose_electrode_is_a_rod_has_one(tmp_path):
    text = sweep.bare(earthing="TT", more=BARN + ROD)
    (tmp_path / "relay.toml").write_text(sweep.DEVICE)
    (tmp_path / "site.toml").write_text(text)
    assert not any("without an electrode" in w for w in read_site(tmp_path / "site.toml").warnings)
