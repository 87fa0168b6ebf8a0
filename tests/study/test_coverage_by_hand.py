"""What stages clear and see, counted by hand over the six states of ``hand_corridor`` under two load models."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.site import Feed
from relaycfg.study.coverage import AS_FED, cover_of, coverage
from relaycfg.study.evidence import Evidence
from relaycfg.study.scenarios import Scenarios
from relaycfg.study.stages import active_stages
from tests.study.hand_corridor import evidence, settings, stage, states

STAGES = settings(stage(280.0, 0.6), stage(320.0, 0.1, 2))
IMPEDANCE = "all constant impedance"


def pair() -> tuple[Scenarios, Scenarios]:
    """As modelled 285 V 0.7 s and 325 V 0.5 s are cleared; then 270 V 5 s is not, and 310 V harms nothing."""
    other = states(
        model=IMPEDANCE,
        volts=[262.0, 270.0, 285.0, 310.0, 250.0, 230.0],
        deadline_s=[5.0, 5.0, 0.5, np.inf, 5.0, np.inf],
    )
    return states(), other


def test_a_state_is_cleared_and_seen_only_if_it_is_under_both_load_models(tmp_path: Path) -> None:
    # Harmful under either: all six. Cleared under both: 325 V, harmless at 310 V. Seen under both: 285 V 0.5 s (late),
    # 325 and 310 V.
    base = evidence(tmp_path, *pair())
    found = cover_of(base, "59", active_stages(base, STAGES))
    assert found.elements == "59"
    assert found.cleared_percent == pytest.approx(100 / 6)
    assert found.seen_percent == pytest.approx(100 * 2 / 6)


def test_states_without_a_solution_count_as_harmful_and_neither_cleared_nor_seen(tmp_path: Path) -> None:
    first, second = pair()
    unsolved = replace(first, resolved=np.array([True, True, True, False, True, True]))
    base = evidence(tmp_path, unsolved, replace(second, high=np.zeros(6, bool), low=np.zeros(6, bool)))
    found = cover_of(base, "59", active_stages(base, STAGES))
    # Left to clear: 285 V 0.7 s, harmless under the second model.
    assert found.cleared_percent == pytest.approx(100 / 6)
    assert found.seen_percent == pytest.approx(100 / 6)


def test_only_nominal_supply_counts_and_places_add_up(tmp_path: Path) -> None:
    limit = states("upper limit"), states("upper limit", IMPEDANCE)
    more = (
        states(volts=[325.0, 330.0], deadline_s=[0.5, 0.5]),
        states(model=IMPEDANCE, volts=[325.0, 330.0], deadline_s=[0.5, 0.5]),
    )
    base = evidence(tmp_path, *pair(), *limit, *more)
    found = cover_of(base, "59", active_stages(base, STAGES))
    assert found.cleared_percent == pytest.approx(100 * 3 / 8)
    assert found.seen_percent == pytest.approx(100 * 4 / 8)


def test_without_harm_there_is_nothing_to_clear(tmp_path: Path) -> None:
    calm = states(volts=[285.0, 230.0], deadline_s=[np.inf, np.inf])
    base = evidence(tmp_path, calm, replace(calm, model=IMPEDANCE))
    found = cover_of(base, "59", active_stages(base, STAGES))
    assert (found.cleared_percent, found.seen_percent) == (None, 50.0)


def test_only_sets_with_a_stage_have_a_row(tmp_path: Path) -> None:
    base = evidence(tmp_path, *pair())
    assert [c.elements for c in coverage(base, active_stages(base, STAGES))] == ["59", "59 + 27", "all"]


@pytest.mark.parametrize(("between", "failing"), [("L1-N", 1), ("L2-N", 0), ("L1-L2", 2), ("auxiliary", None)])
def test_a_relay_without_its_volts_neither_clears_nor_sees(between: str, failing: int | None, tmp_path: Path) -> None:
    # Two states, both cleared as such. L1 stands at 250 V (range to 253 V) and 260 V, L2 at 230 V opposite to it:
    # 480 and 490 V between them.
    taps = np.array([[250.0, -230.0, 0.0, 0.0], [260.0, -230.0, 0.0, 0.0]], complex)
    some = states(volts=[325.0, 325.0], deadline_s=[0.5, 0.5], core=np.ones(2, bool), taps=taps)
    base: Evidence = evidence(tmp_path, some, replace(some, model=IMPEDANCE))
    base = replace(base, relay=replace(base.relay, supply=Feed(between, 195.0, 253.0)))
    rows = {c.elements: c for c in coverage(base, active_stages(base, STAGES))}
    assert rows["all"].cleared_percent == 100.0
    if failing is None:
        assert AS_FED not in rows
    else:
        assert rows[AS_FED].cleared_percent == pytest.approx(50.0 * (2 - failing))
        assert rows[AS_FED].seen_percent == pytest.approx(50.0 * (2 - failing))
