"""Terminal text of derive, check, sheet and the curves: what needs action first."""

from dataclasses import replace

import pytest

from relaycfg.model.device import Function
from relaycfg.text import check_text, curves_text, derive_text, settings_comments, sheet_text

FORMS = [check_text, derive_text, sheet_text, curves_text]


@pytest.mark.parametrize("form", FORMS)
def test_no_line_is_wider_than_the_terminal(form, study):
    assert max(map(len, form(study).splitlines())) <= 100


@pytest.mark.parametrize("form", FORMS)
def test_nothing_is_called_safe_or_said_to_comply(form, study):
    text = form(study).lower()
    assert "safe" not in text
    assert "compl" not in text


def ordered(text, *parts):
    places = [text.index(part) for part in parts]
    assert places == sorted(places)


def test_check_says_first_what_to_turn(study):
    text = check_text(study)
    ordered(
        text,
        "1 exception found",
        "Exceptions (1)",
        "turn U< from 207 to 182 V",
        "it trips in common dips",
        "Warnings",
        "Settings",
    )
    ordered(
        text,
        "Cases that fail (1 of 2)",
        "case 2, three-phase dip: expected hold, 27 stage 1 after 0.15 s (all lines)",
        "Settings",
    )
    ordered(text, "Cases as expected (1 of 2)", "1 three-phase dip")


def test_derive_shows_settings_then_what_is_wrong_then_why(study):
    text = derive_text(study)
    ordered(text, "Settings\n", "265.0 V", "Exceptions (1)", "Reasons", "Bounds", "Margins", "Not detected")
    assert "59 stage 1 pickup not below 261.0 V: case 1, upper limit\n    253 / 0.97 / 0.99 [EN 50160]" in text
    assert "1.7 units, 4.0 V, 1.50 s (case 1, upper limit)" in text


def test_a_stage_that_is_off_is_listed_with_its_reason(study):
    text = derive_text(study)
    assert any(line.split()[:4] == ["27", "stage", "1", "OFF"] for line in text.splitlines())
    assert "it adds nothing here" in text


def test_residual_volts_are_named_as_such(study):
    result = study.stages[0]
    residual = replace(result, stage=replace(result.stage, function=Function.DISPLACEMENT, quantity="3v0", pickup=66.0))
    assert "66.0 V 3V0" in derive_text(replace(study, stages=(residual,)))


def test_inputs_that_are_not_the_users_own_are_counted(study):
    assert "Inputs: 1 assumed, 1 default of 3." in " ".join(check_text(study).split())


def test_without_exceptions_the_verdict_names_its_criteria(study):
    assert "No exception found against the stated criteria, over 200 sampled load states" in sheet_text(
        replace(study, findings=())
    )


def test_what_is_not_detected_is_always_said(study):
    for form in (check_text, derive_text):
        text = form(study)
        assert "A break with balanced load moves no voltage: no voltage relay can see it." in text
        assert "the break is not upstream of the relay's tap at MB" in text
        assert "59 from 2.04:1:1, 47 never" in text
        assert (
            "Not cleared in time: 7 harmful scenarios; 3 of them no secure setting clears, the others were given up "
            "for security margin or are not set."
        ) in " ".join(text.split())


@pytest.mark.parametrize(
    ("uncleared", "blocked", "said"),
    [
        (1, 1, "1 harmful scenario; no secure setting clears it."),
        (5, 5, "5 harmful scenarios; no secure setting clears them."),
        (1, 0, "1 harmful scenario; it was given up for security margin or is not set."),
        (5, 0, "5 harmful scenarios; they were given up for security margin or are not set."),
        (5, 4, "4 of them no secure setting clears, the other was given up for security margin or is not set."),
    ],
)
def test_what_is_not_cleared_is_counted_with_its_reason(study, uncleared, blocked, said):
    text = check_text(replace(study, uncleared=uncleared, blocked=blocked))
    assert said in " ".join(text.split())


def test_cover_has_two_columns_of_different_shares(study):
    text = check_text(study)
    assert "Harmful states cleared in time  All states in which it operates" in text
    assert any(line.split() == ["59", "97.6", "%", "61.5", "%"] for line in text.splitlines())
    assert any(line.split() == ["47", "-", "0.0", "%"] for line in text.splitlines())


def test_what_a_stage_clears_alone_is_said_once(study):
    assert check_text(study).count("alone it clears 49.5 % of the harmful states in time") == 1
    assert "alone it clears" not in derive_text(study)


def test_an_order_is_given_once(study):
    orders = "59 stage 1: turn U> from 253 to 261 V"
    first = replace(study.findings[0], do=orders)
    second = replace(study.findings[0], do=f"{orders}; switch 59 stage 2 on: U> 327 V")
    third = replace(study.findings[0], do=orders)
    text = " ".join(check_text(replace(study, findings=(first, second, third))).split())
    assert text.count(orders) == 1
    assert "do: as for 1; switch 59 stage 2 on: U> 327 V" in text
    assert "do: as for 1 if left" in text


def test_what_a_finding_says_is_not_said_again_among_the_blind_spots(study):
    unseen = study.breaks.summaries[1].why_not
    place = replace(study.findings[1], about="break at Workshop", sentence=f"break at Workshop is not seen: {unseen}")
    closed = replace(study.findings[0], do=f"no secure setting exists: {study.closed[0].sentence}")
    for form in (check_text, derive_text):
        text = " ".join(form(replace(study, findings=(closed, place))).split())
        assert text.count(unseen) == 1
        assert text.count(study.closed[0].sentence) == 1
        assert "Breaks not seen from here, the warnings say why: Workshop." in text


def test_a_case_names_the_stage_of_each_margin(study):
    row = next(line for line in check_text(study).splitlines() if line.startswith("1 three-phase dip"))
    assert row.split()[-8:] == ["20.0", "59", "stage", "1", "0.30", "27", "stage", "1"]
    free = replace(study.cases[0], margin_s=None, nearest_s="")
    row = next(line for line in check_text(replace(study, cases=(free,))).splitlines() if line.startswith("1 three"))
    assert row.split()[-2:] == ["-", "-"]


def test_no_hit_in_the_sample_is_not_zero(study):
    seen, unseen = study.breaks.summaries
    none = replace(study, breaks=replace(study.breaks, summaries=(replace(seen, undetected=unseen.undetected), unseen)))
    text = check_text(none)
    assert "MB (N): harmful 61.5 % (1.0-99.0), undetected 0 (< 3/200)" in text
    assert "Workshop (N): harmful 61.5 % (1.0-99.0), not seen" in text
    assert "high volts, cleared late 1.5 % (1.0-99.0)" in text


def test_curves_name_the_case_behind_every_step_once(study):
    text = curves_text(study)
    assert "Worst standing value 253.0 V: case 1, upper limit" in text
    assert text.count("case 4, swell") == 1
    ordered(text, "for ever", "5.00", "0.50")
    assert "(W), less measuring, output, coil and breaker: nothing limits it" in text


def test_comments_for_the_settings_file_go_by_stage_label(study):
    assert settings_comments(study) == {"59 stage 1": "slow step", "27 stage 1": "it adds nothing here"}


def test_the_base_of_percentages_and_what_47_measures_are_named(study):
    result = study.stages[0]
    unbalance = replace(
        result,
        stage=replace(result.stage, function=Function.UNBALANCE, quantity="V2/V1", pickup=7.0),
        pickup_percent=None,
    )
    text = derive_text(replace(study, stages=(result, unbalance)))
    assert "Base of 59: 230 V line to neutral. 47 measures V2/V1." in text


def test_a_margin_that_nothing_limits_says_so(study):
    result = study.stages[0]
    free = replace(result.margins, dependability_v=None, dependability_units=None, dependability_case="no state left")
    text = derive_text(replace(study, stages=(replace(result, margins=free),)))
    assert "clears by  nothing limits it (no state left)" in text


@pytest.mark.parametrize(
    ("status", "words"),
    [
        ("read", "read"),
        ("quoted", "as quoted"),
        ("memory", "from memory, verify"),
        ("own", "own"),
        ("user", "given by the user"),
        ("computed", "computed"),
        ("assumed", "assumed"),
    ],
)
def test_a_failing_case_says_who_says_so_and_how_well_it_is_known(study, status, words):
    failing = replace(study.cases[1], status=status)
    assert f"to 40 % for 0.2 s [IEC 61000-4-11; {words}]" in check_text(replace(study, cases=(failing,)))
    unnamed = replace(failing, source="")
    assert f"to 40 % for 0.2 s [{words}]" in check_text(replace(study, cases=(unnamed,)))


def test_a_name_is_not_said_twice(study):
    finding = replace(study.findings[0], about="break at MB", sentence="break at MB is not seen")
    assert " 1. break at MB is not seen" in check_text(replace(study, findings=(finding,)))


def test_many_groups_of_uncleared_states_are_cut_short_and_counted(study):
    text = check_text(replace(study, closed=study.closed * 9))
    assert text.count("3 scenarios are closed by case 4") == 4
    assert "and 5 smaller groups" in text


def test_wide_tables_lose_no_column(study):
    stage = replace(
        study.stages[0].stage, function=Function.DISPLACEMENT, quantity="3v0", pickup=366.0, delay_s=10.0, hold_s=0.5,
        reset="held", phases="any", action="alarm", dropout_ratio=0.975,
    )  # fmt: skip
    wide = replace(study.stages[0], stage=stage, marked=1234.5, marked_unit="%", pickup_percent=159.1)
    slow = replace(
        study.cases[0], name="Short circuit behind a board far away", nearest_s="59N stage 1", margin_v=-149.5
    )
    text = check_text(replace(study, stages=(wide,), cases=(slow,)))
    assert not any(line.endswith("..") for line in text.splitlines())
    assert any(line.endswith("alarm") for line in text.splitlines())
    assert any(line.endswith("59N stage 1") for line in text.splitlines())
