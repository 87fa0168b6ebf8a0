"""What a load's volts do to it: stated by the user, else of its kind, else nothing; printed with its source."""

import pytest

from tests.study import yard


def resolved(folder, more):
    tables = "".join(yard.load("Main", f"L{k}-N", 2.0, f"load {k}") for k in (2, 3))
    site = yard.site(folder, loads=yard.load("Main", "L1-N", 2.0, "first") + more + tables)
    return next(load for load in site.loads if load.name == "first"), site


def limits(load):
    return load.cutout_pu, load.restart_s, load.damage_pu


def test_a_load_of_no_kind_with_limits_never_drops_out_nor_fails(tmp_path):
    load, _ = resolved(tmp_path, "")
    assert limits(load) == (None, None, None)
    assert load.stall_pu is None


def test_electronics_have_those_of_their_kind_and_the_inputs_say_whose(tmp_path):
    """Source: values/load-kinds kind-electronics: cut-out 0.35 (own); a 450 V capacitor at 318.2 / 230."""
    load, site = resolved(tmp_path, 'kind = "electronics"\n')
    assert limits(load) == (0.35, 1.0, 1.38)
    assert load.damage_pu * 230 == pytest.approx(450 / 2**0.5, rel=0.005)
    found = {i.field: i for i in site.inputs if " of electronics" in i.field}
    for key in ("cutout_pu", "restart_s", "damage_pu"):
        assert found[f"load.*.{key} of electronics"].status == "own"


def test_what_the_user_states_goes_before_the_kind_and_stands_with_the_load(tmp_path):
    load, site = resolved(tmp_path, 'kind = "electronics"\ncutout_pu = 0.6\nrestart_s = 3\ndamage_pu = 1.5\n')
    assert limits(load) == (0.6, 3, 1.5)
    note = next(i.note for i in site.inputs if i.field == "load.first.kw")
    assert "cutout 0.6 pu, restart 3 s, damage 1.5 pu" in note
    assert not [i for i in site.inputs if i.field.startswith("load.*.cutout_pu")]


def test_a_discharge_lamp_goes_out_in_the_middle_of_the_known_range_and_restrikes_after_minutes(tmp_path):
    """Source: values/load-kinds discharge-lamp-out, 0.7 to 0.8 pu (common practice, from memory)."""
    load, site = resolved(tmp_path, 'kind = "discharge lamp"\n')
    assert limits(load) == (0.75, 300.0, None)
    assert next(i.status for i in site.inputs if i.field == "load.*.cutout_pu of discharge lamp") == "memory"


def test_single_phase_compressors_stall_and_three_phase_ones_do_not(tmp_path):
    """Source: values/load-kinds stall and stall-after, quoted: below 0.55, then P 3.5 and Q 5 times rated."""
    load, _ = resolved(tmp_path, 'kind = "air conditioner"\npf = 0.8\n')
    assert load.stall_pu == 0.55
    assert load.stalled_va == pytest.approx(2500 * complex(3.5, 5.0))
    whole = 'kind = "air conditioner"\n'
    site = yard.site(tmp_path, loads=yard.load("Main", "L1-L2-L3-N", 6.0, "first") + whole + yard.UNEQUAL)
    assert next(x for x in site.loads if x.name == "first").stall_pu is None
