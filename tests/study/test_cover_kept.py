"""What is given up of an element's greatest cover is given up once, not by the choice and again by raising margins."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from relaycfg.model.device import Function
from relaycfg.study.choice import best_cover, covered_by, demand, harmful_states
from relaycfg.study.settle import settle
from tests.study.hand_corridor import evidence
from tests.study.small_grids import SPANS, drawn_grids, drawn_states


@pytest.mark.parametrize("seed", [3044, 3209, 3466, 3473])
def test_settled_stages_keep_their_share_of_the_greatest_cover(
    seed: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(SPANS, Function.OVERVOLTAGE, (240.0, 1.0, 233.0, 345.0))
    monkeypatch.setitem(SPANS, Function.UNDERVOLTAGE, (130.0, 1.0, 120.0, 227.0))
    rng = np.random.default_rng(seed)
    function = (Function.OVERVOLTAGE, Function.UNDERVOLTAGE)[seed % 2]
    (grid,) = drawn_grids(rng, (function,), pickups=90, delays=6, stages=2)
    scenarios = (drawn_states(rng, (function,), 900), drawn_states(rng, (function,), 50))
    own = grid.ladder
    wanted = harmful_states(scenarios)
    need = tuple(w & s.core for w, s in zip(wanted, scenarios, strict=True))
    best = best_cover(own, demand(own, scenarios, wanted), demand(own, scenarios, need), own.element.stages)
    greatest = sum(int((covered_by(own, best, s) & w).sum()) for s, w in zip(scenarios, wanted, strict=True))
    base = evidence(tmp_path, *scenarios, own=own)
    settings = settle(replace(base, site=replace(base.site, judgement=own.judgement))).settings
    cleared = grid.stage_clears([s for s in settings.of(function) if s.on], scenarios)
    kept = int((cleared & np.concatenate(wanted)).sum())
    assert kept >= own.judgement.cover_kept * greatest
