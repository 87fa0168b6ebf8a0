"""What the first pages promise: figures as in the study, what stays undetected first, the rest counted."""

import re
from dataclasses import replace
from io import BytesIO

import pdfplumber
import pytest
from pypdf import PdfReader

from relaycfg.model.device import Function
from relaycfg.model.settings import Stage
from relaycfg.sheet import figures, fonts, render
from relaycfg.sheet.decision import counts, told
from relaycfg.sheet.ink import Ink
from relaycfg.sheet.wording import Wording


def rendered_lines(study, templates, page):
    with pdfplumber.open(BytesIO(render(study, templates, "0.1.0"))) as pdf:
        return pdf.pages[page].extract_text(x_tolerance=1).replace("\u00a0", " ").split("\n")


def test_the_settings_read_back_are_those_of_the_study(lines, sample):
    page = lines["plain"][0]
    for result in sample.study().stages:
        stage = result.stage
        if not stage.on:
            assert f"{stage.function.value} {stage.number} OFF" in " ".join(page)
            continue
        delay = f"{stage.delay_s:.3f}" if stage.delay_s < 0.1 else f"{stage.delay_s:.2f}"
        row = next(line for line in page if re.match(rf"{stage.function.value} {stage.number} on ", line))
        figures = f"{stage.pickup:.1f} V {result.pickup_percent:.1f} % of U0 230 V {delay} s {stage.dropout_ratio:.2f}"
        assert figures in row


def test_an_element_the_device_lacks_and_a_stage_left_unused_are_listed(lines, sample, templates):
    text = " ".join(lines["plain"][0])
    assert re.search(r"47 – not on", text)
    study = sample.study()
    fewer = replace(study, stages=tuple(r for r in study.stages if r.stage.label != "59 stage 3"))
    assert any(line.startswith("59 3 OFF") for line in rendered_lines(fewer, templates, 0))


def test_what_is_not_detected_stands_before_the_verdict(lines):
    page = lines["check"][0]
    starts = [
        next(k for k, line in enumerate(page) if line.startswith(s))
        for s in ("Not detected", "Verdict", "Scope", "Prepared")
    ]
    assert starts == sorted(starts)
    assert any("balanced load shifts nothing" in line for line in page)


def test_page_one_shows_five_of_twelve_exceptions_and_says_where_the_rest_is(lines):
    pages = lines["large"]
    first = "\n".join(pages[0])
    assert "Verdict: 12 exceptions" in first
    assert [f"break at place {k}: " in first for k in range(1, 7)] == [True] * 5 + [False]
    page = int(re.search(r"and 7 more on page (\d+)", first).group(1))
    assert "Findings" in pages[page - 1]


def test_page_one_shows_five_blind_places_and_says_where_the_rest_is(lines):
    pages = lines["large"]
    assert "Of 41 modelled break places 39 cannot be seen:" in "\n".join(pages[0])
    page = int(re.search(r"and 34 more on page (\d+)", "\n".join(pages[0])).group(1))
    assert "What it sees and what not" in pages[page - 1]


@pytest.mark.parametrize("text", ["short", "a finding told at very great length " * 20])
def test_page_one_stays_one_page_however_long_its_findings(sample, templates, text):
    study = sample.study(exceptions=5, boards=40)
    long = replace(study, findings=tuple(replace(f, sentence=text.strip()) for f in study.findings))
    reader = PdfReader(BytesIO(render(long, templates, "0.1.0")))
    assert "Accepted" in reader.pages[0].extract_text()
    assert "NOT to be set" in reader.pages[1].extract_text()


def test_counts_are_those_of_the_inputs_and_cases(sample):
    study = sample.study()
    found = counts(study)
    assert found["defaults"] == str(len([i for i in study.site.inputs if i.tag == "default"]))
    assert found["memory_cases"] == str(len([c for c in study.cases if c.status == "memory"]))
    assert found["memory_inputs"] == str(len([i for i in study.site.inputs if i.status == "memory"]))
    assert (found["samples"], found["seed"]) == ("400", "20")
    assert "waivers" not in found


def test_a_checker_who_is_the_preparer_is_told_so(lines, sample, templates):
    study = sample.study()
    document = replace(study.site.document, checked=study.site.document.prepared)
    same = replace(study, site=replace(study.site, document=document))
    warning = "The person named as checker is the preparer: another person has to check."
    assert warning in rendered_lines(same, templates, 0)
    assert warning not in lines["plain"][0]


def test_the_card_gives_the_figure_on_the_devices_own_scale(lines):
    card = "\n".join(lines["plain"][1])
    assert "Set exactly these figures" in card
    assert re.search(r"59 / 1 .*116\.0 %", card)
    assert "of 230 V line to neutral = 266.8 V, any line" in card
    assert re.search(r"59N / 2 .*88\.0 V", card)
    assert card.count("V0 (not 3V0)") == 2
    assert "Turn OFF: 27 stage 2." in card
    assert "Reconnection: by hand." in card


@pytest.mark.parametrize(
    ("kind", "title"), [("check", "As found, NOT to be set"), ("large", "Derived with exceptions, NOT to be set")]
)
def test_the_card_of_figures_that_are_not_to_be_set_says_so_in_a_heavy_frame(lines, sheets, kind, title):
    card = lines[kind][1]
    assert card[1] == title
    text = " ".join(card)
    assert "see page 1" in text
    assert "relaycfg derive" in text
    assert "Set exactly" not in text
    assert "Set to" not in text
    assert "Turn OFF" not in text
    with pdfplumber.open(BytesIO(sheets[kind])) as pdf:
        assert max(line["linewidth"] for line in (*pdf.pages[1].lines, *pdf.pages[1].rects)) > 3


def test_a_check_without_exceptions_is_no_order_to_set_either(sample, templates):
    assert "As found, NOT to be set" in rendered_lines(sample.checked(exceptions=0), templates, 1)


def test_reconnection_is_printed_as_set_and_nobody_is_said_to_have_asked(lines):
    text = " ".join(line for page in lines["check"] for line in page)
    assert "Reconnection: automatic after 60.00 s: an exception, see the findings." in text
    assert "asked in writing" not in text


@pytest.mark.parametrize(("earthed", "warned"), [(True, True), (False, False)])
def test_a_pen_switched_with_the_lines_is_warned_of(sample, templates, earthed, warned):
    study = sample.study()
    boards = tuple(replace(b, neutral_earth_link=earthed and b.neutral_earth_link) for b in study.site.boards)
    text = " ".join(rendered_lines(replace(study, site=replace(study.site, boards=boards)), templates, 1))
    assert ("behind the split of N and PE, or open the lines only" in text) is warned


def test_a_range_that_is_not_stated_is_said_to_be_so_for_supply_and_coil(sample, templates):
    study = sample.study()
    open_feed = replace(study.site.relay.supply, low_v=None, high_v=None)
    relay = replace(study.site.relay, supply=open_feed, trip_coil=open_feed)
    text = " ".join(rendered_lines(replace(study, site=replace(study.site, relay=relay)), templates, 1))
    assert text.count("working range not stated") == 2


def test_27_and_59n_ask_for_line_to_line_first(lines):
    assert "\n".join(lines["plain"][1]).count("Measure line to line first") == 2


def test_page_one_says_what_is_not_cleared(lines):
    text = " ".join(lines["plain"][0])
    assert "At nominal supply 2.8 % of 586 harmful load states at the places seen" in text
    assert "58.5 % with relay and coil fed as they are" in text
    assert (
        "23 scenarios not cleared in time = 9 that no secure setting clears + 14 given up for security margin" in text
    )
    assert "14 that a secure setting would clear and these do not" in " ".join(lines["check"][0])


def test_each_blind_place_has_its_share_of_harmful_states(lines):
    assert "relay's measuring point; 73.2 % of its load states do harm" in " ".join(lines["plain"][0])


def test_what_was_not_examined_is_counted_on_page_one_and_listed(lines):
    counted = re.search(r"Not examined: (\d+) kinds of event, listed on page (\d+)", " ".join(lines["plain"][0]))
    page = lines["plain"][int(counted.group(2)) - 1]
    start = page.index("Not examined")
    assert len([line for line in page[start:] if line.startswith("– ")]) == int(counted.group(1)) == 7


def test_what_is_cleared_and_what_is_seen_have_headings_of_their_own(lines):
    text = " ".join(lines["plain"][2])
    assert "Harmful states cleared" in text
    assert "All states in which it" in text
    assert "59 82.4 % 69.5 %" in text
    assert "27 none does harm 25.6 %" in text
    assert "stiff source at nominal volts, 230.0 V" in text
    assert "no-load volts, 242.0 V" in text


def test_a_finding_names_what_it_is_about_once(sample):
    finding = sample.findings(1)[0]
    assert str(told(finding)).startswith("<b>break at place 1</b>: 2.1 %")
    again = replace(finding, about="59 stage 1", sentence="59 stage 1, 253 V, trips in case 4")
    assert str(told(again)) == "<b>59 stage 1</b>, 253 V, trips in case 4"


def test_a_margin_stands_with_its_stage(lines):
    text = "\n".join(line for page in lines["plain"] for line in page)
    assert "V0 V Margin V Margin s" in text
    assert re.search(r"4\.4 V –\n.*\n?.*59 stage 1", text)
    assert "trip: 59N stage 1" in text


def test_a_site_warning_that_is_a_finding_is_printed_once(sample, templates):
    study = sample.study()
    warning = study.site.warnings[0]
    finding = replace(study.findings[0], about="site", sentence=warning)
    text = " ".join(
        " ".join(page.extract_text().split())
        for page in PdfReader(BytesIO(render(replace(study, findings=(finding,)), templates, "0.1.0"))).pages
    )
    assert text.count("The tap position was") == 1


def test_sources_are_listed_once_and_each_has_a_status(sample, templates):
    study = sample.study()
    cases = (replace(study.cases[0], source="site", status="user"), *study.cases[1:])
    with pdfplumber.open(BytesIO(render(replace(study, cases=cases), templates, "0.1.0"))) as pdf:
        page = next(p for p in pdf.pages if "Sources and their status" in p.extract_text())
        tables = page.find_tables({"horizontal_strategy": "lines", "vertical_strategy": "text"})
        text = page.extract_text(x_tolerance=1)
    assert tables
    assert not re.search(r"^site\b", text, re.MULTILINE)
    assert len(re.findall(r"^household coefficients, row 4", text, re.MULTILINE)) == 1
    assert "household coefficients, row 4 of the table of load kinds from memory, verify" in text.replace(
        "own choice, ", ""
    )


def test_both_digests_stand_on_the_last_page_in_full_and_once(lines, sample):
    study = sample.study()
    last = "\n".join(lines["plain"][-1])
    assert last.count(study.input_digest) == last.count(study.settings.digest) == 1
    assert "sha256 sha256" not in last


@pytest.mark.parametrize(
    ("written", "printed"),
    [
        ("0.00833333", "0.008333"),
        ("0.5", "0.5"),
        ("[0.930871, 12]", "[0.9309, 12]"),
        ("1234.567", "1235"),
        ("230.125 + j0.00833333", "230.1 + j0.008333"),
        ("type 1.2345678", "type 1.2345678"),
        ("195.5", "195.5"),
    ],
)
def test_computed_inputs_are_rounded_and_written_ones_kept(written, printed):
    assert figures.given(written) == printed


def test_long_names_break_at_dots_and_underscores(sample, templates):
    fonts.register()
    ink = Ink(sample.study(), Wording(templates / "sheet"), "0.1.0", 500.0, 700.0)
    broken = str(ink.broken("board.Workshop.cable.reactance_ohm_per_km", 100.0))
    assert "".join(broken.split("<br/>")) == "board.Workshop.cable.reactance_ohm_per_km"
    assert all(part[-1] in "._" for part in broken.split("<br/>")[:-1])


def test_an_alarm_stage_is_marked_on_the_card(sample, templates):
    study = sample.study()
    first = study.stages[0]
    alarm = replace(study, stages=(replace(first, stage=replace(first.stage, action="alarm")), *study.stages[1:]))
    assert "alarm only" in "\n".join(rendered_lines(alarm, templates, 1))


def test_places_unseen_say_so_and_shares_carry_their_interval(lines):
    page = " ".join(lines["plain"][2])
    assert "7.2 % (5.1 to" in page
    assert "Workshop (N). Not seen: the break is downstream" in page
    assert "Harmed and not disconnected: Workshop." in page


def test_the_test_schedule_has_bands_and_blanks(lines):
    page = lines["plain"][3]
    assert any("263.3 to 268.7 V" in line for line in page)
    assert any("0.060 to 0.10 s" in line for line in page)
    assert any("As found As left" in line for line in page)
    assert any("never above 9.6 V" in line for line in page)


def test_a_value_from_memory_is_marked_to_be_verified(lines):
    text = "\n".join(line for page in lines["plain"] for line in page)
    assert "EN 50550, operating times from memory, verify" in text


def test_a_case_that_fails_is_marked(sample, templates):
    study = sample.study()
    failed = replace(study, cases=(replace(study.cases[0], outcome="trip", passed=False),))
    text = "\n".join(page.extract_text() for page in PdfReader(BytesIO(render(failed, templates, "0.1.0"))).pages)
    assert "! trip" in text


def test_every_caution_is_printed(lines):
    text = " ".join(line for page in lines["plain"] for line in page)
    for words in (
        "not protection against electric shock",
        "cannot detect every broken neutral",
        "metalwork may be live",
        "until continuity of the neutral is proved, dead and under load",
        "Never open a neutral on a live, loaded board",
        "Lines open first, the neutral closes first",
        "A PEN conductor is",
        "Prove testers",
        "Valid only for the source",
        "life depends on a load",
        "Computed potentials are indicative",
        "Machines may restart",
        "Surge protectors",
        "fed in by a neighbour",
        "does not supervise itself",
        "Call the network operator",
        "Local codes and the licensed engineer",
    ):
        assert words in text


def test_a_held_reset_prints_its_time(sample, templates):
    study = sample.study()
    first = study.stages[0]
    held = Stage(Function.OVERVOLTAGE, 1, True, 266.8, 4.1, 0.98, "held", 2.0, quantity="l-n")
    changed = replace(study, stages=(replace(first, stage=held), *study.stages[1:]))
    assert any("held 2.00 s" in line for line in rendered_lines(changed, templates, 0))
