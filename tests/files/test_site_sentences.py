"""Every mistake in a site is answered by one sentence that says where, what and what to write."""

import pytest

from relaycfg.errors import InputError
from relaycfg.files import read_site

LINES = "L1-N, L2-N, L3-N, L1-L2, L2-L3, L3-L1, L1-L2-L3, L1-L2-L3-N"
V = "nominal_v = 230"
KW = "kw = 2\n"
CABLE = "length_m = 40\nline_mm2 = 25\nneutral_mm2 = 25\npe_mm2 = 16"
CASES = {
    "line-to-line for line-to-neutral": (
        V, "nominal_v = 400",
        "site.toml:2:1: supply.nominal_v is 400, which looks like a line-to-line voltage; "
        "give volts from line to neutral, 230",
    ),
    "text for a number": (
        V, 'nominal_v = "230"', 'site.toml:2:1: supply.nominal_v is "230"; give volts from line to neutral, 50 to 600'
    ),
    "true for a number": (
        V, "nominal_v = true", "site.toml:2:1: supply.nominal_v is true; give volts from line to neutral, 50 to 600"
    ),
    "not a number": (
        V, "nominal_v = nan", "site.toml:2:1: supply.nominal_v is nan; give volts from line to neutral, 50 to 600"
    ),
    "infinite": (KW, "kw = inf\n", "site.toml:29:1: load.Kiln.kw is inf; give kW, -10000 to 10000"),
    "limit above nominal": (
        V, V + "\nlow_percent = 5\nhigh_percent = 10",
        "site.toml:3:1: supply.low_percent is 5; give a negative percent of nominal, -30 to 0",
    ),
    "one limit only": (
        V, V + "\nlow_percent = -5",
        "site.toml:1:1: supply.high_percent is missing; give both low_percent and high_percent",
    ),
    "band and limits": (
        V, V + '\nband = "EN 50160 all"\nlow_percent = -5\nhigh_percent = 5',
        "site.toml:3:1: supply.band is given beside low_percent or high_percent; give a band or both limits",
    ),
    "unknown band": (
        V, V + '\nband = "EN 50160 al"', 'site.toml:3:1: supply.band is "EN 50160 al"; did you mean "EN 50160 all"?'
    ),
    "band at an unknown board": (
        V, V + '\nband_at = "Workshp"',
        'site.toml:3:1: supply.band_at is "Workshp", an unknown board; did you mean "Workshop"?',
    ),
    "unknown system": (
        V, V + '\nsystem = "2ph-4w"', 'site.toml:3:1: supply.system is "2ph-4w"; did you mean "3ph-4w"?'
    ),
    "unknown earthing": ('"TN-S"', '"TN-X"', 'site.toml:3:1: supply.earthing is "TN-X"; did you mean "TN-S"?'),
    "TN-C-S without a link": (
        '"TN-S"', '"TN-C-S"',
        'site.toml:3:1: supply.earthing is "TN-C-S" without a board that links N and PE; '
        "write neutral_earth_link = true in the board where the PEN ends",
    ),
    "TT with a link": (
        '"TN-S"\n', '"TT"\n[[board]]\nname = "X"\nfed_from = "source"\nneutral_earth_link = true\n',
        "site.toml:7:1: board.X.neutral_earth_link is true in a TT system; remove it, or give another earthing",
    ),
    "unknown table": ("[supply]", "[[loda]]\n[supply]", "site.toml:1:1: loda is not a known table; did you mean load?"),
    "single brackets": (
        "[[source]]", "[source]", "site.toml:5:1: source is one table; write [[source]] in double brackets"
    ),
    "two sources": (
        "[[board]]\nname = \"MB\"", '[[source]]\nkind = "transformer"\nrating_kva = 9\n[[board]]\nname = "MB"',
        "site.toml:11:1: source.2 is a second source, not yet available; keep one [[source]]",
    ),
    "no rating": (
        "rating_kva = 400\n", "",
        'site.toml:5:1: source.grid.rating_kva is missing; give it for kind = "transformer"',
    ),
    "no-load volts between lines": (
        "rating_kva = 400", "rating_kva = 400\nno_load_v = 400",
        "site.toml:9:1: source.grid.no_load_v is 400, which looks like a line-to-line voltage; "
        "give volts from line to neutral, 184 to 287.5",
    ),
    "ohms of a transformer": (
        "rating_kva = 400", "rating_kva = 400\nline_ohm = [0.1, 0.1]",
        'site.toml:9:1: source.grid.line_ohm is not used by kind = "transformer"; '
        'remove it, or give kind = "impedance"',
    ),
    "class of a transformer": (
        "rating_kva = 400", 'rating_kva = 400\nclass = "G2"',
        'site.toml:9:1: source.grid.class is not used by kind = "transformer"; remove it, or give kind = "generator"',
    ),
    "neutral of a transformer": (
        "rating_kva = 400", "rating_kva = 400\nneutral_ohm = [0, 0]",
        'site.toml:9:1: source.grid.neutral_ohm is not used by kind = "transformer"; '
        'remove it, or give kind = "generator" or "impedance"',
    ),
    "vector group of a generator": (
        'kind = "transformer"\nrating_kva = 400\nimpedance_percent = 4',
        'kind = "generator"\nrating_kva = 400\nvector_group = "Dyn11"',
        'site.toml:9:1: source.grid.vector_group is not used by kind = "generator"; '
        'remove it, or give kind = "transformer"',
    ),
    "sheet of a CSV": (
        KW, KW + '[loads]\nfile = "loads.csv"\nsheet = "Loads"\n',
        "site.toml:32:1: loads.sheet is not used by a CSV file; remove it, or give an .xlsx file",
    ),
    "low seconds without low volts": (
        KW, KW + "[equipment]\nsustained_low_s = 5\n",
        "site.toml:31:1: equipment.sustained_low_s is not used without sustained_low_v; give sustained_low_v too",
    ),
    "temperature beside ohms": (
        CABLE, "line_ohm = [0.1, 0.01]\ntemperature_c = 70",
        "site.toml:19:1: board.Workshop.cable is given both in ohms and by section; "
        "keep line_ohm, neutral_ohm, pe_ohm or the sections",
    ),
    "impedance that leads": (
        KW, 'ohm = [20, 5]\nreactive = "leading"\n',
        "site.toml:30:1: load.Kiln.reactive is given beside ohm; remove it: ohm is a constant impedance",
    ),
    "vector group without neutral": (
        "rating_kva = 400", 'rating_kva = 400\nvector_group = "Dd0"',
        'site.toml:9:1: source.grid.vector_group is "Dd0"; give one such as Dyn11, Yzn5 or Yyn0',
    ),
    "unknown feeder": (
        'fed_from = "MB"', 'fed_from = "Mains"',
        'site.toml:17:1: board.Workshop.fed_from is "Mains", an unknown board; '
        'give one of "source", "MB", "Workshop"',
    ),
    "loop": (
        'fed_from = "source"', 'fed_from = "Workshop"',
        'site.toml:13:1: board.MB.fed_from is "Workshop", a loop (MB from Workshop from MB); '
        'feed one of them from "source" or another board',
    ),
    "same name after strip": (
        'name = "Workshop"', 'name = " MB "\n',
        'site.toml:16:1: board.MB.name is "MB", used before; give every one a name of its own',
    ),
    "reserved name": (
        'name = "Workshop"', 'name = "none"',
        'site.toml:16:1: board.none.name is "none", a reserved place name; give another name',
    ),
    "empty name": ('name = "Workshop"', 'name = " "', "site.toml:16:1: board.2.name is empty; give a name"),
    "control character": (
        'name = "Workshop"', 'name = "a\\u0007b"',
        'site.toml:16:1: board.a b.name is "a\\u0007b", with the control character U+0007; '
        "write plain text",
    ),
    "negative length": (
        "length_m = 40", "length_m = -4",
        "site.toml:20:1: board.Workshop.cable.length_m is -4; give metres, above 0 to 20000",
    ),
    "cable of no impedance": (
        CABLE, "line_ohm = [0, 0]",
        "site.toml:20:1: board.Workshop.cable.line_ohm is zero; "
        "leave [board.cable] out for a board beside its feeder",
    ),
    "ohms and sections": (
        CABLE, CABLE + "\nline_ohm = [1, 1]",
        "site.toml:19:1: board.Workshop.cable is given both in ohms and by section; "
        "keep line_ohm, neutral_ohm, pe_ohm or the sections",
    ),
    "no section": (
        CABLE, "length_m = 40",
        "site.toml:19:1: board.Workshop.cable.line_mm2 is missing; give length_m and line_mm2, or line_ohm",
    ),
    "no fourth line": (
        '"L1-N"', '"L4-N"', f'site.toml:28:1: load.Kiln.between is "L4-N"; lines are L1, L2, L3; give one of {LINES}'
    ),
    "lines the other way round": ('"L1-N"', '"L2-L1"', 'site.toml:28:1: load.Kiln.between is "L2-L1"; write "L1-L2"'),
    "load on an unknown board": (
        'board = "MB"', 'board = "MC"',
        'site.toml:26:1: load.Kiln.board is "MC", an unknown board; give one of "MB", "Workshop"',
    ),
    "unknown kind": (
        KW, KW + 'kind = "led lightning"\n',
        'site.toml:30:1: load.Kiln.kind is "led lightning"; did you mean "led lighting"?',
    ),
    "no reading": (KW, "", "site.toml:25:1: load.Kiln.kw is missing; give one of kw, current_a, ohm"),
    "two readings": (
        KW, KW + "current_a = 3\n",
        "site.toml:29:1: load.Kiln.kw is given beside current_a; give one of kw, current_a, ohm",
    ),
    "no power": (KW, "kw = 0\n", "site.toml:29:1: load.Kiln.kw is 0; give its rating, or remove the load"),
    "power factor above 1": (
        KW, KW + "pf = 1.2\n", "site.toml:30:1: load.Kiln.pf is 1.2; give a power factor, above 0 to 1"
    ),
    "shares of another sum": (
        KW, KW + "zip_p = [1, 1, 1]\n", "site.toml:30:1: load.Kiln.zip_p is of sum 3; give [z, i, p] of sum 1"
    ),
    "band that leaves out 1": (
        KW, KW + "band_pu = [1.1, 1.2]\n",
        "site.toml:30:1: load.Kiln.band_pu is [1.1, 1.2]; give [low, high], 0 < low < 1 < high",
    ),
    "impedance with a kind": (
        KW, 'ohm = [20, 5]\nkind = "fan"\n',
        "site.toml:30:1: load.Kiln.kind is given beside ohm; remove it: ohm is a constant impedance",
    ),
    "points that fall": (
        KW, KW + "[equipment]\npoints = [[300, 1], [280, 0.5]]\n",
        "site.toml:31:21: equipment.points is [280, 0.5] after [300, 1]; give rising volts with falling seconds",
    ),
    "points of three": (
        KW, KW + "[equipment]\npoints = [[300, 1, 2]]\n",
        "site.toml:31:11: equipment.points is [300, 1, 2]; give [[V, s], ...] with rising volts",
    ),
    "unknown curve": (
        KW, KW + '[equipment]\novervoltage = "household envelope"\n',
        'site.toml:31:1: equipment.overvoltage is "household envelope"; did you mean "household overvoltage envelope"?',
    ),
    "unknown set": (
        KW, KW + '[must_hold]\nsets = ["public"]\n',
        'site.toml:31:9: must_hold.sets is "public"; did you mean "public supply"?',
    ),
    "evidence of nothing": (
        KW, KW + '[[evidence]]\nof = "supply.nominal"\ntag = "measured"\n',
        'site.toml:31:1: evidence.1.of is "supply.nominal", no given input; did you mean "supply.nominal_v"?',
    ),
    "evidence of a default": (
        KW, KW + '[[evidence]]\nof = "supply.frequency_hz"\ntag = "measured"\n',
        'site.toml:31:1: evidence.1.of is "supply.frequency_hz", no given input; '
        "it is a default here; give the value itself, then its evidence",
    ),
    "unknown tag": (
        KW, KW + '[[evidence]]\nof = "supply.nominal_v"\ntag = "measure"\n',
        'site.toml:32:1: evidence.1.tag is "measure"; did you mean "measured"?',
    ),
    "relay at an unknown board": (
        KW, KW + '[[relay]]\nname = "R1"\nmeasures_at = "Mb"\ndevice = "relay.toml"\n',
        'site.toml:32:1: relay.R1.measures_at is "Mb", an unknown board; did you mean "MB"?',
    ),
    "trips an unknown board": (
        KW, KW + '[[relay]]\nname = "R1"\nmeasures_at = "MB"\ntrips = "Works"\ndevice = "relay.toml"\n',
        'site.toml:33:1: relay.R1.trips is "Works", an unknown board; did you mean "Workshop"?',
    ),
    "feed from the PE": (
        KW, KW + '[[relay]]\nname = "R1"\nmeasures_at = "MB"\ndevice = "relay.toml"\nsupply = { from = "L1-PE" }\n',
        'site.toml:34:12: relay.R1.supply.from is "L1-PE"; '
        'give one of "auxiliary", "L1-N", "L2-N", "L3-N", "L1-L2", "L2-L3", "L3-L1"',
    ),
    "a character that turns the writing round": (
        'name = "Workshop"', 'name = "Work\u2066shop"',
        'site.toml:16:1: board.Work shop.name is "Work\\u2066shop", '
        "with the control character U+2066 left-to-right isolate; write plain text",
    ),
    "a mark in a text that is printed": (
        "[supply]", '[document]\ntitle = "a\u200eb"\n[supply]',
        'site.toml:2:1: document.title is "a\\u200eb", with the control character U+200E left-to-right mark; '
        "write plain text",
    ),
    "a number too large": (
        KW, "kw = 1e999\n", "site.toml:29:1: load.Kiln.kw is 1e999; give kW, -10000 to 10000"
    ),
    "a number too large in a list": (
        KW, "ohm = [1, -1e999]\n", "site.toml:29:11: load.Kiln.ohm is -1e999; give [r, x] in ohms"
    ),
    "unknown kind that is near to none": (
        KW, KW + 'kind = "constant voltage"\n',
        'site.toml:30:1: load.Kiln.kind is "constant voltage"; give one of "resistive heater", "lighting mix", '
        '"air conditioner", "refrigerator", "fan", "pump", "washing machine", "range", "dryer", '
        '"water heater", "dishwasher", "heat-pump water heater", ...',
    ),
    "feed without its range": (
        KW, KW + '[[relay]]\nname = "R1"\nmeasures_at = "MB"\ndevice = "relay.toml"\nsupply = { from = "L1-N" }\n',
        "site.toml:34:1: relay.R1.supply.range_v is missing; give [low, high] in volts for a feed from the lines",
    ),
    "fault at an unknown board": (
        KW, KW + '[[fault]]\nboard = "Yard"\ncircuit_ohm = [0.1, 0]\nclearing_s = 0.1\n',
        'site.toml:31:1: fault.1.board is "Yard", an unknown board; give one of "MB", "Workshop"',
    ),
    "negative volts in a case": (
        KW,
        KW + '[[case]]\nname = "c"\nexpect = "hold"\n[[case.segment]]\nduration_s = 1\nl_n_v = [0, 230, -1]\n',
        "site.toml:35:1: case.c.segment.1.l_n_v is [0, 230, -1]; give magnitudes in volts, 0 to 5000",
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_a_mistake_is_answered_word_for_word(bench, name):
    old, new, sentence = CASES[name]
    bench.put("relay.toml", bench.device)
    bench.put("loads.csv", "board,between,kw\nMB,L2-N,1\n")
    assert bench.sentences(bench.with_(old, new)) == [sentence]


def test_low_volts_and_loads_that_mind_them_have_an_effect_only_together(bench):
    minding, volts = "minds_low_v = true\n", "[equipment]\nsustained_low_v = 184\n"
    assert bench.read(bench.site + minding + volts).warnings == ()
    assert bench.read(bench.site + minding).warnings == (
        "Load Kiln: minds_low_v has no effect without [equipment] sustained_low_v.",
    )
    assert bench.read(bench.site + volts).warnings == (
        "Equipment: sustained_low_v has no effect, for no load states minds_low_v.",
    )


def test_a_misspelt_key_is_named_with_its_near_match_once(bench):
    assert bench.sentences(bench.with_("nominal_v", "nominal")) == [
        "site.toml:2:1: supply.nominal is not a known key; did you mean nominal_v?",
    ]


def test_members_of_a_group_share_one_usage(bench):
    more = 'group = "day"\nusage = 0.3\n[[load]]\nboard = "MB"\nname = "Fan"\nbetween = "L2-N"\nkw = 1\n'
    assert bench.sentences(bench.site + more + 'group = "day"\nusage = 0.4\n') == [
        'site.toml:38:1: load.Fan.usage is 0.4 in group "day"; '
        "members of a group share one usage; write 0.3 or another group"
    ]


def test_every_relay_reports_its_missing_device_file_and_unknown_board(bench):
    second = bench.relay.replace("R1", "R2").replace('"MB"', '"Attic"')
    assert bench.sentences(bench.site + bench.relay + second) == [
        'site.toml:34:1: relay.R1.device is "relay.toml", not there; '
        "give the path of a device file, from the folder of the site",
        'site.toml:38:1: relay.R2.measures_at is "Attic", an unknown board; give one of "MB", "Workshop"',
        'site.toml:39:1: relay.R2.device is "relay.toml", not there; '
        "give the path of a device file, from the folder of the site",
    ]


def test_two_relays_have_names_of_their_own(bench):
    bench.put("relay.toml", bench.device)
    again = bench.site + bench.relay + bench.relay
    assert bench.sentences(again) == [
        'site.toml:37:1: relay.R1.name is "R1", used before; give every one a name of its own'
    ]


def test_the_first_relay_is_studied_until_another_is_asked_for_and_each_has_its_own_inputs(bench):
    bench.put("relay.toml", bench.device)
    one = bench.read(bench.site + bench.relay)
    both = bench.read(bench.site + bench.relay + bench.relay.replace("R1", "R2").replace('"MB"', '"Workshop"'))
    assert [r.name for r in both.relays] == ["R1", "R2"]
    assert both.relay == one.relay == both.relays[0]
    second = both.with_relay("R2")
    assert (second.relay.name, second.relay.measures_at, second.relay.trips) == ("R2", "Workshop", "Workshop")
    assert [r.name for r in second.every_relay] == ["R2", "R1"]
    assert both.digest != one.digest
    assert {i.field.split(".")[1] for i in both.inputs if i.field.startswith("relay.")} == {"R1", "R2"}


def test_a_study_that_needs_a_relay_says_so(bench):
    assert bench.sentences(bench.site, need_relay=True) == [
        "site.toml: relay is missing; write a [[relay]] table with name, measures_at and device"
    ]
    assert bench.read(bench.site).relay is None


def test_an_empty_site_lists_what_it_takes(bench):
    assert bench.sentences("") == [
        "site.toml: supply is missing; write a [supply] table",
        "site.toml: source is missing; write a [[source]] table",
        "site.toml: board is missing; write a [[board]] table",
        "site.toml: load is missing; give at least one [[load]] or a [loads] file",
    ]


@pytest.mark.parametrize(
    ("content", "sentence"),
    [
        (b"[supply", "site.toml:1:8: not TOML (a table header without its closing bracket); correct the line"),
        (b"a = 1\nb = '\xe9'\n", "site.toml:2:6: not UTF-8 text; save the file as UTF-8"),
        ("a = 1".encode("utf-16-le"), "site.toml:1:2: not UTF-8 text; save the file as UTF-8"),
        (b"[a]\n[a]\n", "site.toml:2:3: not TOML (a table given twice); correct the line"),
        (b"a = 1\na = 2\n", "site.toml:2:6: not TOML (a key or table given twice); correct the line"),
        (b"a = 1,5\n", "site.toml:1:6: not TOML (more on the line than a key and its value); correct the line"),
        (
            b"a = yes\n",
            "site.toml:1:5: not TOML (a value that is no number, text in quotes, list or table); correct the line",
        ),
        (b'a = "x\n', "site.toml:1:7: not TOML (a text without its closing quotes); correct the line"),
        (b'a = "C:\\data"\n', "site.toml:1:10: not TOML (a backslash in a text: write it twice); correct the line"),
        (
            b"a = 1\rb = 2\r",
            "site.toml:1:6: a line that ends in CR alone; save the file with line ends LF or CR LF",
        ),
        (b"x" * 1_000_000, "site.toml:1:1: a line of 1000000 characters; write at most 10000 in a line"),
        (b"# \n" * 2_000_000, "site.toml: larger than 5 MB; give a file of this kind only, or split it"),
        (b"a = " + b"[\n" * 5000, "site.toml: nested too deeply; write flat tables"),
        (b"a" + b".a" * 3000 + b" = 1", "site.toml: nested too deeply; write flat tables"),
        (b"a = " + b"9" * 5000, "site.toml:1:5: not TOML (a number is too long); correct the line"),
    ],
)
def test_a_file_that_cannot_be_parsed_says_where(bench, content, sentence):
    with pytest.raises(InputError) as caught:
        read_site(bench.put("site.toml", content))
    assert [p.sentence() for p in caught.value.problems] == [sentence]


def test_a_missing_file_offers_its_neighbour_and_a_folder_asks_for_a_file(bench, tmp_path):
    bench.put("site.toml", bench.site)
    for path, sentence in (
        ("sit.toml", "sit.toml: not there; did you mean site.toml?"),
        (
            "elsewhere.ini",
            "elsewhere.ini: not there; give the path of a site file, or begin one with: relaycfg new DIR",
        ),
        (".", ".: a folder; give the path of a file in it"),
    ):
        with pytest.raises(InputError) as caught:
            read_site(tmp_path.__class__(path))
        assert caught.value.text() == sentence


def test_the_line_is_shown_with_a_caret_below_the_key(bench):
    with pytest.raises(InputError) as caught:
        bench.read(bench.with_("length_m = 40", "  length_m = -4"))
    assert caught.value.text().splitlines() == [
        "site.toml:20:3: board.Workshop.cable.length_m is -4; give metres, above 0 to 20000",
        "      length_m = -4",
        "      ^",
    ]


def test_twenty_problems_are_shown_and_the_rest_counted(bench):
    bad = "".join(f'[[load]]\nboard = "X{i}"\nname = "{i}"\nbetween = "L1-N"\nkw = 1\n' for i in range(25))
    with pytest.raises(InputError) as caught:
        bench.read(bench.site + bad)
    shown = caught.value.text()
    assert len(caught.value.problems) == 25
    assert shown.count("an unknown board") == 20
    assert shown.endswith("and 5 more")


def test_standard_input_is_read_with_paths_from_the_current_folder(bench):
    bench.put("relay.toml", bench.device)
    site = read_site(None, text=bench.site + bench.relay)
    assert site.relay is not None
    with pytest.raises(InputError, match=r"^standard input:2:1: supply.nominal_v is 400"):
        read_site(None, text=bench.with_("230", "400"))
