"""Sites of two lines: what does not exist there is answered by one sentence, what is left has a meaning of its own."""

import pytest

from relaycfg.errors import InputError
from relaycfg.files import read_site, site_schema
from relaycfg.files.resolve_cases import moved_neutral
from relaycfg.model.geometry import split_phase, two_of_star
from tests.study import two_lines

GIVE = "lines are L1, L2; give one of L1-N, L2-N, L1-L2"
MOTOR = '[[motor]]\nboard = "Panel"\nname = "Fan"\nshaft_kw = 1\n'
CASE = '[[case]]\nname = "Logger"\nexpect = "hold"\n[[case.segment]]\nduration_s = 1\nl_n_v = {volts}\n'
SENTENCES = {
    "load on a third line": (
        "2ph-3w", two_lines.load("L3-N", 1.0, "x"), f'load.x.between is "L3-N" in a 2ph-3w system; {GIVE}'
    ),
    "three-wire load": (
        "1ph-3w", two_lines.load("L1-L2-L3", 1.0, "x"), f'between is "L1-L2-L3" in a 1ph-3w system; {GIVE}'
    ),
    "motor without its lines": ("1ph-3w", MOTOR, f"motor.Fan.between is missing in a 1ph-3w system; {GIVE}"),
    "motor on a third line": (
        "1ph-3w", MOTOR + 'between = "L2-L3"\n', f'motor.Fan.between is "L2-L3" in a 1ph-3w system; {GIVE}'
    ),
    "three volts in a case": (
        "1ph-3w", CASE.format(volts=[120, 120, 0]), "segment.1.l_n_v is [120, 120, 0]; give [L1, L2] in volts"
    ),
    "three angles in a case": (
        "1ph-3w", CASE.format(volts=[120, 120]) + "angle_deg = [0, 180, 0]\n",
        "segment.1.angle_deg is [0, 180, 0]; give [L1, L2] in degrees",
    ),
}  # fmt: skip
SUPPLIES = {
    "order of legs": (
        "1ph-3w", 'phase_order = "L1-L2-L3"',
        'supply.phase_order is not used by system = "1ph-3w"; remove it: two legs of one winding have no order',
    ),
    "V2 of legs": (
        "1ph-3w", "unbalance_percent = 2",
        'unbalance_percent is not used by system = "1ph-3w"; remove it: legs that differ are displacement_percent',
    ),
}  # fmt: skip


@pytest.mark.parametrize(("system", "more", "sentence"), SENTENCES.values(), ids=SENTENCES)
def test_what_a_system_of_two_lines_does_not_have_is_refused(tmp_path, system, more, sentence):
    with pytest.raises(InputError) as caught:
        two_lines.site(tmp_path, system, more=more)
    (problem,) = caught.value.problems
    assert problem.sentence().endswith(sentence)


@pytest.mark.parametrize(("system", "supply", "sentence"), SUPPLIES.values(), ids=SUPPLIES)
def test_keys_of_a_star_are_refused_for_the_legs_of_one_winding(tmp_path, system, supply, sentence):
    with pytest.raises(InputError) as caught:
        two_lines.site(tmp_path, system, supply=supply)
    assert [p.sentence().endswith(sentence) for p in caught.value.problems] == [True]


def test_a_feed_from_a_third_line_is_refused(tmp_path):
    two_lines.site(tmp_path, "1ph-3w")
    path = tmp_path / "site.toml"
    path.write_text(
        path.read_text().replace('supply = { from = "auxiliary" }', 'supply = { from = "L2-L3", range_v = [1, 2] }')
    )
    with pytest.raises(InputError, match='"L2-L3" in a 1ph-3w system; give one of auxiliary, L1-N, L2-N, L1-L2'):
        read_site(path)


def transformer(folder, system, keys):
    """A site behind a transformer."""
    two_lines.site(folder, system)
    path = folder / "site.toml"
    plain = 'kind = "impedance"\nline_ohm = [0.01, 0.01]\nneutral_ohm = [0.0, 0.0]'
    path.write_text(path.read_text().replace(plain, f'kind = "transformer"\nrating_kva = 25\n{keys}'))
    return read_site(path)


def test_a_centre_tapped_transformer_is_given_from_its_nameplate(tmp_path):
    """The tables hold three-phase transformers: no percent and no X/R is taken from them for one winding."""
    with pytest.raises(InputError) as caught:
        transformer(tmp_path, "1ph-3w", 'vector_group = "Dyn11"')
    said = [p.sentence() for p in caught.value.problems]
    assert len(said) == 3
    assert sum("three-phase transformers only" in s for s in said) == 2
    assert any("vector_group is not used by" in s for s in said)
    site = transformer(tmp_path, "1ph-3w", "impedance_percent = 2\nx_over_r = 1\nzero_sequence_ratio = 0.5")
    assert site.source.neutral_ohm == pytest.approx(-site.source.line_ohm / 4)  # (Z0 - Z1) / 2, own arithmetic
    assert transformer(tmp_path, "2ph-3w", "").source.line_ohm.real > 0


def test_volts_between_the_legs_in_place_of_a_legs_own_are_pointed_out(tmp_path):
    """208 V on two lines of a star are those between 120 V ones; 240 V may be a leg of 480 V, so it is a question."""

    def rewritten(system, volts):
        two_lines.site(tmp_path, system)
        path = tmp_path / "site.toml"
        text = path.read_text().replace("nominal_v = 120", f"nominal_v = {volts}")
        path.write_text(text.replace('band = "ANSI C84.1 Range B, 120 V service"', ""))
        return read_site(path)

    with pytest.raises(InputError, match=r"208, which looks like a line-to-line voltage.*line to neutral, 120"):
        rewritten("2ph-3w", 208)
    asked = [w for w in rewritten("1ph-3w", 240).warnings if w.startswith("Supply:")]
    assert asked == [
        "Supply: 240 V from line to neutral is 480 V between the legs; if 240 V is read between them, nominal_v is 120."
    ]
    assert not any(w.startswith("Supply:") for w in two_lines.site(tmp_path, "1ph-3w").warnings)


def test_a_logged_neutral_of_split_phase_stands_between_the_legs():
    """Source: own arithmetic: 160 and 80 V add to 240 V, so each leg is 120 V and N has moved by 40 V towards L2.

    Of two lines of a star two volts leave source and shift open.
    """
    emf, phasors = moved_neutral([160.0, 80.0], split_phase())
    assert emf == pytest.approx(120)
    assert phasors == pytest.approx((160, -80))
    assert moved_neutral([138.0, 70.0], two_of_star()) is None


def test_a_case_of_two_volts_is_played_as_a_moved_neutral(tmp_path):
    site = two_lines.site(tmp_path, "1ph-3w", more=CASE.format(volts=[160, 80]))
    assert site.user_cases[0].segments[0].l_n_v == pytest.approx((160, -80))


def test_the_schema_offers_the_three_systems():
    supply = site_schema()["$defs"]["SupplyForm"]["properties"]["system"]
    assert supply["enum"] == ["3ph-4w", "1ph-3w", "2ph-3w"]
