"""Several relays together and the seat of another one, against volts shown state by state and a relay really placed."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.model.site import Equipment, Site
from relaycfg.study.breaks import breaks
from relaycfg.study.elsewhere import best_seat, elsewhere
from relaycfg.study.evidence import Evidence, gather
from relaycfg.study.scenarios import seen_places
from relaycfg.study.settle import settle
from relaycfg.study.stages import ActiveStage, active_stages
from relaycfg.study.study import check, derive
from relaycfg.study.together import Acting, cleared_states, opens_s, others, solved_models, together
from tests.study.yard import RELAY, site

SECOND = RELAY.split("[[fault]]")[0].replace('"R1"', '"R2"').replace('"Main"', '"Shed"')
SAMPLES = 60


def settled(made: Site, samples: int = SAMPLES) -> tuple[Evidence, tuple[ActiveStage, ...]]:
    assert made.relay is not None
    evidence = gather(made, made.relay, samples, 1)
    return evidence, active_stages(evidence, settle(evidence).settings)


def deadline_s(equipment: Equipment, highest_v: float) -> float:
    """Seconds that equipment stands, step by step as the withstand curve is read."""
    if highest_v <= equipment.sustained_high_v:
        return np.inf
    return min([equipment.sustained_high_s, *(s for v, s in equipment.high_points if highest_v >= v)])


def fastest_s(stages: tuple[ActiveStage, ...], l_n_v: tuple[float, ...], v0_v: float) -> float:
    """Seconds until the fastest stage that picks up has opened its switch."""
    severity = {Function.OVERVOLTAGE: max(l_n_v), Function.UNDERVOLTAGE: -min(l_n_v), Function.DISPLACEMENT: v0_v}
    return min([s.clearing_s for s in stages if severity[s.function] >= s.insensitive.pickup], default=np.inf)


def test_shares_of_two_relays_are_those_of_states_shown_one_by_one(tmp_path: Path) -> None:
    made = site(tmp_path, relay=RELAY + SECOND)
    evidence, stages = settled(made)
    acting = {"R1": stages} | {a.relay.name: a.stages for a in others(evidence)}
    relays = {r.name: r for r in made.relays}
    for result in together(evidence, stages):
        harmful = dict.fromkeys(("R1", "R2", "both"), 0)
        cleared = dict.fromkeys(("R1", "R2", "both"), 0)
        for k in range(SAMPLES):
            (row,) = breaks(made, samples=1, seed=1, at=result.at, state=f"sample {k}").rows
            assert row.all_impedance is not None
            for names in (("R1",), ("R2",), ("R1", "R2")):
                harm, good = False, True
                for one in (row, row.all_impedance):
                    opened = {
                        n: fastest_s(acting[n], one.relays[n].l_n_v, one.relays[n].v0_v)
                        for n in names
                        if result.at in seen_places(made, relays[n])
                    }
                    for board, volts in one.boards.items():
                        due = deadline_s(made.equipment, max(volts.l_n_v))
                        behind = [s for n, s in opened.items() if board in made.behind(relays[n].trips)]
                        harm |= np.isfinite(due)
                        good &= not np.isfinite(due) or min(behind, default=np.inf) <= due
                name = names[0] if len(names) == 1 else "both"
                harmful[name] += harm
                cleared[name] += harm and good
        assert (result.harmful.count, result.harmful.of) == (harmful["both"], SAMPLES)
        assert (result.cleared.count, result.cleared.of) == (cleared["both"], harmful["both"])
        for name, share in result.alone.items():
            assert (share.count, share.of) == (cleared[name], harmful["both"])
    assert harmful["both"] > 0


def test_a_relay_that_opens_a_sub_board_alone_clears_no_break_that_harms_the_main_board(tmp_path: Path) -> None:
    evidence, stages = settled(site(tmp_path, relay=RELAY + SECOND))
    at = {t.at: t for t in together(evidence, stages)}
    assert at["Main"].harmful.count > 0
    assert at["Main"].alone["R2"].count == 0
    assert "R1" not in at["Shed"].alone
    assert at["Shed"].cleared == at["Shed"].alone["R2"]
    assert at["Shed"].cleared.count > 0


def test_one_relay_has_nobody_to_act_with(tmp_path: Path) -> None:
    assert derive(site(tmp_path), 50, 1).together == ()


def test_two_relays_may_sit_on_one_board_and_cover_what_one_covers(tmp_path: Path) -> None:
    twin = RELAY.split("[[fault]]")[0].replace('"R1"', '"R2"')
    evidence, stages = settled(site(tmp_path, relay=RELAY + twin))
    for result in together(evidence, stages):
        assert result.alone == {"R1": result.cleared, "R2": result.cleared} or not result.alone


def test_each_relay_is_studied_as_if_it_were_the_only_one(tmp_path: Path) -> None:
    (tmp_path / "one").mkdir()
    alone = derive(site(tmp_path / "one", relay=SECOND + "[[fault]]" + RELAY.split("[[fault]]")[1]), 100, 1)
    both = site(tmp_path, relay=RELAY + SECOND)
    assert derive(both, 100, 1).settings.for_relay == "R1"
    second = derive(both.with_relay("R2"), 100, 1)
    assert second.settings.stages == alone.settings.stages
    assert second.breaks.summaries == alone.breaks.summaries


def test_the_seat_behind_an_unseen_break_clears_what_a_relay_placed_there_is_checked_to_clear(tmp_path: Path) -> None:
    evidence, stages = settled(site(tmp_path), 400)
    (seat,) = (e for e in elsewhere(evidence, stages) if e.at == "Shed")
    assert (seat.seen, seat.best.board, seat.own_cleared.count) == (False, "Shed", 0)
    moved = site(tmp_path, relay=RELAY.replace('"Main"', '"Shed"', 2))
    settings = settle(evidence).settings
    placed = check(moved, settings, 400, 1)
    (summary,) = (s for s in placed.breaks.summaries if s.at == "Shed")
    in_time = sum(v.count for name, v in summary.classes.items() if "none /" not in name and "in time" in name)
    assert (seat.best.cleared.count, seat.best.cleared.of) == (in_time, summary.harmful.count)
    assert in_time > 0


def test_the_best_seat_is_the_one_found_by_trying_every_board(tmp_path: Path) -> None:
    """Behind the star link Main and Shed are seats that disconnect different boards; the search may skip neither."""
    evidence, stages = settled(site(tmp_path), 300)
    own = Acting(evidence.relay, stages, evidence)
    for place in evidence.site.places:
        models = solved_models(evidence, place)
        counts = {}
        for board in evidence.site.behind(place):
            relay = replace(evidence.relay, measures_at=board, trips=board)
            opened = ((relay, opens_s(replace(own, relay=relay), place, models)),)
            counts[board] = int(cleared_states(evidence.site, evidence.network, models, opened)[1].sum())
        assert best_seat(own, place, models).cleared.count == max(counts.values())
    assert max(counts.values()) > 0


def test_unseen_breaks_name_the_board_for_another_relay_and_one_that_sits_there_already(tmp_path: Path) -> None:
    (warning,) = (f for f in derive(site(tmp_path), 200, 1).findings if "Shed is not seen" in f.sentence)
    assert warning.severity == "warning"
    assert warning.do.startswith("place a relay at Shed that opens it (the same device and settings would clear ")
    watched = derive(site(tmp_path, relay=RELAY + SECOND), 200, 1)
    (note,) = (f for f in watched.findings if "Shed is not seen" in f.sentence)
    assert (note.severity, note.do) == ("note", "judge R2, which sees it (--relay)")


def test_a_seat_where_nothing_is_harmed_is_not_recommended_by_a_share(tmp_path: Path) -> None:
    made = site(tmp_path)
    calm = replace(made, equipment=replace(made.equipment, sustained_high_v=900.0, high_points=((950.0, 0.2),)))
    study = derive(calm, 50, 1)
    (found,) = (f for f in study.findings if "Shed is not seen" in f.sentence)
    assert found.do == "place a relay at a board behind that break, or accept it in writing"


@pytest.mark.parametrize("name", ["R3", ""])
def test_an_unknown_relay_cannot_be_studied(name: str, tmp_path: Path) -> None:
    with pytest.raises(KeyError):
        site(tmp_path).with_relay(name)


def test_every_share_of_relays_together_is_of_the_harmful_states_of_the_whole_sample(tmp_path: Path) -> None:
    evidence, stages = settled(site(tmp_path, relay=RELAY + SECOND))
    for result in together(evidence, stages):
        assert result.harmful.of == SAMPLES
        assert result.cleared.of == result.harmful.count
        assert all(result.cleared.count >= alone.count for alone in result.alone.values())
