"""Terminal text of breaks: what is not seen first, and short."""

from dataclasses import replace

from relaycfg.model.break_results import Share
from relaycfg.text import breaks_text


def crowded(study, places=30, states=10):
    """The same results at many places and states."""
    rows = [replace(study.rows[0], at=f"Board {p}", state=f"state {s}") for p in range(places) for s in range(states)]
    summaries = [replace(study.summaries[p % 2], at=f"Board number {p} of the north yard") for p in range(places)]
    return replace(study, rows=tuple(rows), summaries=tuple(summaries), places=places, notes=study.notes * places)


def test_it_starts_with_how_many_places_the_relay_sees(site, break_study):
    first = breaks_text(site, break_study).splitlines()[0]
    assert first == "North yard: relay R1 at MB sees 1 of 2 places where the neutral can break."


def test_places_not_seen_come_before_the_figures_with_the_reason(site, break_study):
    text = breaks_text(site, break_study)
    assert text.index("the break is not upstream of the relay's tap at MB") < text.index(
        "State connected, neutral open"
    )


def test_a_place_shows_the_worst_board_and_the_relay(site, break_study):
    line = next(x for x in breaks_text(site, break_study).splitlines() if x.startswith("MB") and "264.5" in x)
    assert line.split() == ["MB", "N", "Workshop", "173.5", "264.5", "264.5", "172.5", "263.5", "263.5", "57.5", "12.0"]


def test_flags_and_notes_are_shown(site, break_study):
    text = breaks_text(site, break_study)
    assert "! MB; Workshop: below band" in text
    assert text.count("below band: some load gets less than the volts its law holds for") == 1
    assert "above band:" not in text
    assert "the load is balanced" in text


def test_harm_that_the_switch_does_not_disconnect_is_named(site, break_study):
    assert "not disconnected by the relay: Workshop" in breaks_text(site, break_study)


def test_without_all_it_stays_within_sixty_lines(site, break_study):
    lines = breaks_text(site, crowded(break_study)).splitlines()
    assert len(lines) <= 60
    assert sum("--all shows them" in line for line in lines) >= 3


def test_all_lists_every_state_and_board(site, break_study):
    crowd = crowded(break_study)
    text = breaks_text(site, crowd, everything=True)
    assert text.count("At relay R1: N-PE -; unbalance: line-to-neutral deviation 26.0 %") == len(crowd.rows)
    assert "line-to-line deviation 0.0 %, V2/V1 0.0 %, spread 39.0 %" in " ".join(text.split())
    for row in crowd.rows:
        assert f"{row.at} (N), state {row.state}, converged" in text
    assert "--all" not in text


def test_no_line_is_wider_than_the_terminal_and_no_column_is_lost(site, break_study):
    name = "A board with a very long name in the yard"
    boards = {name: break_study.rows[0].boards["MB"]}
    rows = tuple(replace(row, at=name, boards=boards, conductor="PEN") for row in break_study.rows)
    every = Share(2000, 2000, 0.998, 1.0)
    summaries = tuple(replace(s, at=name, harmful=every, undetected=every) for s in break_study.summaries)
    crowd = replace(break_study, rows=rows, summaries=summaries)
    for text in (breaks_text(site, crowd), breaks_text(site, crowd, everything=True)):
        lines = text.splitlines()
        assert max(map(len, lines)) <= 100
        assert any(line.endswith("PE-earth") for line in lines)
        assert any(line.endswith("not solved") for line in lines)
        assert not any(line.endswith("..") for line in lines)


def floors(site, study):
    """Forty boards whose names begin alike and end alike."""
    names = [f"Distribution board {b}, floor {f}" for b in range(1, 6) for f in range(1, 9)]
    boards = tuple(replace(site.boards[0], name=name) for name in names)
    rows = tuple(replace(study.rows[0], at=n, boards={n: study.rows[0].boards["MB"]}) for n in names)
    summaries = tuple(
        replace(study.summaries[1], at=n, boards_harmed=tuple(names), not_disconnected=tuple(names)) for n in names
    )
    notes = study.notes * len(names)
    return replace(site, boards=boards), replace(study, rows=rows, summaries=summaries, places=40, notes=notes)


def test_names_that_begin_alike_stay_apart_on_one_screen(site, break_study):
    many, study = floors(site, break_study)
    lines = breaks_text(many, study).splitlines()
    assert len(lines) <= 60
    assert max(map(len, lines)) <= 100
    tables = [k for k, line in enumerate(lines) if line.startswith("Place  ")]
    assert len(tables) == 3
    for start in tables:
        shown = [line.split("  ")[0] for line in lines[start + 1 : start + 4]]
        assert all("1, floor " in name for name in shown)
        assert len(set(shown)) == 3


def test_a_joint_shows_its_ohms_amperes_and_watts(site, break_study):
    joint = replace(break_study, rows=(replace(break_study.rows[0], joint_ohm=2.0, joint_a=12.35, joint_w=1305.1),))
    text = breaks_text(site, joint)
    assert "neutral joint of 2 ohm" in text
    assert "12.3  1 305" in text


def test_the_columns_of_the_relay_are_named_for_it(site, break_study):
    assert "relay L1  relay L2  relay L3" in breaks_text(site, break_study)


def test_without_settings_a_seen_place_leaves_the_undetected_share_to_them(site, break_study):
    seen, unseen = break_study.summaries
    text = breaks_text(site, replace(break_study, summaries=(replace(seen, classes={}), replace(unseen, classes={}))))
    rows = [line for line in text.splitlines() if line.startswith(("MB  ", "Workshop  "))][-2:]
    assert "depends on settings" in rows[0]
    assert "not seen" in rows[1]
    assert "0 (< 3/200)" not in rows[1]


def test_the_worst_sampled_state_can_be_shown_again(site, break_study):
    text = breaks_text(site, break_study)
    assert "highest at Workshop L2 in sample 17" in " ".join(text.split())
    assert text.count('--state "sample 17"') == 1


def test_a_site_without_relay_says_that_nothing_is_seen(site, break_study):
    rows = tuple(replace(row, relays={}) for row in break_study.rows)
    text = breaks_text(replace(site, relay=None), replace(break_study, rows=rows, seen_places=0))
    assert text.startswith(
        "North yard: 2 places where the neutral can break; no relay is described, so nothing is seen."
    )
