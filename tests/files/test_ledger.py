"""The ledger: every input is there, with its evidence or as a default with the source of what stands in."""

import pytest

from relaycfg.files.ledger import printed
from relaycfg.files.tables import STATUSES

TAGGED = """
[[evidence]]
of = "board.Workshop.cable"
tag = "letter"
note = "drawing 7"

[[evidence]]
of = "board.Workshop.cable.length_m"
tag = "measured"
"""
MINIMAL = """\
[supply]
nominal_v = 230
earthing = "TN-S"
[[source]]
kind = "transformer"
rating_kva = 100
[[board]]
name = "B"
fed_from = "source"
[loads]
file = "loads.csv"
[[relay]]
name = "R1"
measures_at = "B"
device = "relay.toml"
"""


def inputs(site):
    return {i.field: i for i in site.inputs}


def test_what_is_given_is_assumed_until_evidence_says_better(bench):
    before, after = inputs(bench.read()), inputs(bench.read(bench.site + TAGGED))
    assert before["board.Workshop.cable.line_mm2"].tag == "assumed"
    assert after["board.Workshop.cable.line_mm2"].tag == "letter"
    assert after["board.Workshop.cable.line_mm2"].note.startswith("drawing 7; 0.727 ohm/km at 20 C, IEC 60228")
    assert after["board.Workshop.cable.length_m"].tag == "measured"
    assert (after["board.Workshop.cable.length_m"].value, after["board.Workshop.cable.length_m"].unit) == ("40", "m")


def test_evidence_does_not_turn_a_default_into_data(bench):
    assert inputs(bench.read(bench.site + TAGGED))["board.Workshop.cable.metal"].tag == "default"


def test_what_is_left_out_is_a_default_with_source_and_status(bench):
    defaults = [i for i in bench.read().inputs if i.tag == "default"]
    assert {i.field for i in defaults} == {
        "supply.frequency_hz",
        "supply.phase_order",
        "supply.band",
        "supply.band_at",
        "supply.unbalance_percent",
        "supply.displacement_percent",
        "source.grid.no_load_v",
        "source.grid.x_over_r",
        "source.grid.vector_group",
        "source.grid.zero_sequence_ratio",
        "source.grid.star_link_ohm",
        "source.grid.electrode_ohm",
        "source.grid.earth_at",
        "board.Workshop.cable.metal",
        "board.Workshop.cable.temperature_c",
        "board.Workshop.cable.reactance_ohm_per_km",
        "load.*.kind",
        "load.*.pf of constant impedance",
        "load.*.usage",
        "load.*.demand",
        "load.*.third_harmonic_percent",
        "fault.final circuit of MB.clearing_s",
        "fault.final circuit of MB.circuit_ohm",
        "fault.final circuit of Workshop.clearing_s",
        "fault.final circuit of Workshop.circuit_ohm",
        "fault.cable to Workshop.clearing_s",
        "board.touch_limit_v",
        "equipment.overvoltage",
        "equipment.sustained_high_v",
        "equipment.sustained_high_s",
        "must_hold.sets",
        "must_hold.interruption_s",
    }
    assert all(i.note and i.status in STATUSES for i in defaults)


def test_giving_a_value_takes_it_out_of_the_defaults(bench):
    given = inputs(bench.read(bench.with_("nominal_v = 230", "nominal_v = 230\nfrequency_hz = 50")))
    assert given["supply.frequency_hz"].tag == "assumed"
    assert given["supply.frequency_hz"].status == ""


def test_figures_from_memory_are_marked(bench):
    found = inputs(bench.read(bench.with_("impedance_percent = 4\n", "")))
    impedance = found["source.grid.impedance_percent"]
    assert (impedance.value, impedance.status) == ("4", "memory")
    assert impedance.note == "IEC 60076-5, Table 1"
    assert found["must_hold.interruption_s"].status == "memory"


def test_a_default_that_several_loads_share_is_one_entry_that_names_them(bench):
    more = "".join(f'[[load]]\nboard = "MB"\nname = "L{i}"\nbetween = "L1-N"\nkw = 1\ndemand = 1\n' for i in range(6))
    found = inputs(bench.read(bench.site + more))
    assert found["load.*.usage"].note == "own assumption; for Kiln, L0, L1, L2 and 3 more"
    assert found["load.*.demand"].note == "own assumption; for Kiln"


def test_the_evidence_column_of_a_table_tags_its_loads(bench):
    bench.put("loads.csv", "board,name,between,kw,evidence\nMB,Saw,L1-N,1,nameplate\nMB,Fan,L1-N,1,\n")
    found = inputs(bench.read(bench.site + '[loads]\nfile = "loads.csv"\n'))
    assert (found["load.Saw.kw"].tag, found["load.Fan.kw"].tag) == ("nameplate", "assumed")
    assert found["load.Saw.kw"].note == "L1-N at MB, constant impedance, usage 0.5, demand 1"


def test_what_else_a_load_states_and_own_cases_stand_in_the_ledger(bench):
    text = bench.site + "zip_p = [0.2, 0.3, 0.5]\nthird_harmonic_percent = 12\nminds_low_v = true\ncount = 2\n"
    case = '[[case]]\nname = "Crane"\nexpect = "hold"\n[[case.segment]]\nduration_s = 0.8\nl_n_v = [214, 226, 231]\n'
    found = inputs(bench.read(text + case))
    assert found["load.Kiln.kw"].note == (
        "L1-N at MB, zip, usage 0.5, demand 1, zip_p [0.2, 0.3, 0.5], third harmonic 12 %, minds low volts, 2 alike"
    )
    assert (found["case.Crane"].value, found["case.Crane"].note) == ("hold", "[214, 226, 231] V 0.8 s; user")


def test_a_second_bond_is_computed_with_a_warning(bench):
    text = bench.with_('fed_from = "MB"', 'fed_from = "MB"\nneutral_earth_link = true').replace("TN-S", "TN-C-S")
    site = bench.read(text)
    assert site.board("Workshop").neutral_earth_link
    assert site.warnings == (
        "Board Workshop: its N-PE link and the PE in its cable are a second bond; the PE carries current.",
    )


def test_tt_without_an_electrode_warns(bench):
    assert bench.read(bench.with_("TN-S", "TT")).warnings == (
        "TT system without an electrode at any board: metalwork has no path to earth in the model.",
    )


def test_the_digest_follows_the_inputs_and_nothing_else(bench):
    digest = bench.read().digest
    assert digest.startswith("sha256:")
    assert len(digest) == 7 + 64
    assert bench.read("# note\r\n" + bench.site.replace("\n", "\r\n")).digest == digest
    assert bench.read(bench.site + '[document]\nrevision = "B"\n').digest == digest
    assert bench.read(bench.with_("kw = 2\n", "kw = 2.1\n")).digest != digest
    bench.put("relay.toml", bench.device)
    with_relay = bench.read(bench.site + bench.relay).digest
    bench.put("relay.toml", bench.device.replace("max = 300", "max = 301"))
    assert bench.read(bench.site + bench.relay).digest != with_relay


def test_the_digest_follows_the_loads_file_by_content(bench):
    bench.put("loads.csv", "board,name,between,kw\nMB,Saw,L1-N,1\n")
    text = bench.site + '[loads]\nfile = "loads.csv"\n'
    digest = bench.read(text).digest
    bench.put("loads.csv", "# spaces and line ends\r\nboard,name,between,kw\r\nMB, Saw ,L1-N,1.0\r\n")
    assert bench.read(text).digest == digest
    bench.put("loads.csv", "board,name,between,kw\nMB,Saw,L2-N,1\n")
    assert bench.read(text).digest != digest


def test_a_fifteen_line_site_runs_and_counts_what_it_leaves_out(bench):
    bench.put("relay.toml", bench.device)
    bench.put("loads.csv", "board,between,kw\nB,L1-N,1\n")
    assert len(MINIMAL.splitlines()) == 15
    site = bench.read(MINIMAL, need_relay=True)
    defaults = [i for i in site.inputs if i.tag == "default"]
    assert (len(site.inputs), len(defaults)) == (55, 39)
    assert all(i.note and i.status in STATUSES for i in defaults)
    assert site.warnings == ()


def test_a_named_row_keeps_its_status_though_the_user_names_it(bench):
    text = bench.site.replace("nominal_v = 230", 'nominal_v = 230\nband = "China, 220 V"')
    text += '[equipment]\novervoltage = "household overvoltage envelope"\n[must_hold]\nsets = ["public supply"]\n'
    text += '[[evidence]]\nof = "equipment.overvoltage"\ntag = "letter"\nnote = "owner"\n'
    found = inputs(bench.read(text))
    assert (found["supply.band"].tag, found["supply.band"].status) == ("assumed", "memory")
    curve = found["equipment.overvoltage"]
    assert (curve.tag, curve.status) == ("letter", "memory")
    assert curve.note == "owner; EN 50550:2011; IEC 63052:2019 believed equal, Table 1"
    assert found["must_hold.sets"].status == "memory"


def test_a_scaled_curve_and_scaled_swells_say_by_what(bench):
    site = bench.read(bench.with_("nominal_v = 230", "nominal_v = 120"))
    found = inputs(site)
    assert found["equipment.overvoltage"].note.endswith("Table 1, scaled by U0/230")
    assert (found["equipment.overvoltage"].status, found["equipment.overvoltage"].tag) == ("memory", "default")
    assert (found["equipment.scale"].value, found["equipment.scale"].status) == ("0.5217", "own")
    assert site.equipment.source.endswith("scaled by U0/230")
    assert {s[3] for s in site.reference.swells} == {"own", "memory"}
    assert all(s[2].endswith(", scaled by U0/230") for s in site.reference.swells)
    assert not any("scaled" in i.note for i in bench.read().inputs)


def test_a_source_says_one_thing_about_how_it_is_known(bench):
    texts = [i.note for i in bench.read().inputs] + [s[2] for s in bench.read().reference.swells]
    assert not [t for t in texts if "(from memory" in t or "(as quoted" in t or "(ours" in t]


@pytest.mark.parametrize(
    ("value", "text"),
    [(0.00833333, "0.0083"), (0.0125, "0.0125"), (0.0754, "0.0754"), (133.0434783, "133.04"), (400.0, "400"),
     (12345.678, "12345.68"), (0.0, "0"), (0.00012345, "0.000123"), (-0.05, "-0.05")],
)  # fmt: skip
def test_numbers_carry_no_digits_nobody_can_measure(value, text):
    assert printed(value) == text


def test_a_third_harmonic_by_default_is_none_and_says_so(bench):
    third = inputs(bench.read())["load.*.third_harmonic_percent"]
    assert (third.value, third.tag) == ("0", "default")
    assert third.note == "own assumption: 0 assumed; electronics may have much more; for Kiln"
