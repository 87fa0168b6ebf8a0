"""What the first pages promise: figures as in the study, what stays undetected first, the rest counted."""

import re
from dataclasses import replace
from io import BytesIO

import pdfplumber
import pytest
from pypdf import PdfReader

from relaycfg.model.device import Function
from relaycfg.model.settings import Stage
from relaycfg.sheet import render
from relaycfg.sheet.decision import counts


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
    page = lines["plain"][0]
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
    assert [f"break at place {k} " in first for k in range(1, 7)] == [True] * 5 + [False]
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
    assert "Installer's card" in reader.pages[1].extract_text()


def test_counts_are_those_of_the_inputs_and_cases(sample):
    study = sample.study()
    found = counts(study)
    assert found["defaults"] == str(len([i for i in study.site.inputs if i.tag == "default"]))
    assert found["memory_cases"] == str(len([c for c in study.cases if c.status == "memory"]))
    assert (found["waivers"], found["samples"], found["seed"]) == ("0", "400", "20")


def test_a_checker_who_is_the_preparer_is_told_so(lines, sample, templates):
    study = sample.study()
    document = replace(study.site.document, checked=study.site.document.prepared)
    same = replace(study, site=replace(study.site, document=document))
    warning = "The person named as checker is the preparer: another person has to check."
    assert warning in rendered_lines(same, templates, 0)
    assert warning not in lines["plain"][0]


def test_the_card_gives_the_figure_on_the_devices_own_scale(lines):
    card = "\n".join(lines["plain"][1])
    assert re.search(r"59 / 1 dial U> · L1 L2 L3 N 116\.0 % of U0 4\.10 s 0\.98", card)
    assert re.search(r"59N / 2 dial U0> · L1 L2 L3 N 88\.0 V 0\.080 s 0\.95", card)
    assert "Turn OFF: 27 stage 2." in card


def test_an_alarm_stage_is_marked_on_the_card(sample, templates):
    study = sample.study()
    first = study.stages[0]
    alarm = replace(study, stages=(replace(first, stage=replace(first.stage, action="alarm")), *study.stages[1:]))
    assert "alarm only" in "\n".join(rendered_lines(alarm, templates, 1))


def test_places_unseen_say_so_and_shares_carry_their_interval(lines):
    page = " ".join(lines["plain"][2])
    assert "7.2 % (5.1 to" in page
    assert "0 (< 3/400)" in page
    assert "Workshop (N). Not seen: the break is downstream" in page
    assert "Harmed and not disconnected: Workshop." in page


def test_the_test_schedule_has_bands_and_blanks(lines):
    page = lines["plain"][3]
    assert any("263.3 to 268.7 V" in line for line in page)
    assert any("0.060 to 0.10 s" in line for line in page)
    assert any("As found As left" in line for line in page)
    assert any("standing displacement V0; computed 9.6 V" in line for line in page)


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
