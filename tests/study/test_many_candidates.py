"""The joint search holds however many rungs can matter: as many as a withstand curve has steps."""

from dataclasses import replace

import numpy as np

from relaycfg.model.device import Function, SettableRange
from relaycfg.study.choice import candidates, covered_by
from relaycfg.study.joint import joint_core
from tests.study.hand_corridor import ELEMENT, RUNS, ladder, states

STEPS = 40


def test_more_candidates_than_a_machine_word_has_bits_are_searched_whole():
    # Own construction: a staircase of excursions against a staircase of deadlines makes every step a candidate of its
    # own on both elements; every pair is tried by its definition.
    element = replace(ELEMENT, stages=1, pickup=SettableRange(240.0, 420.0, 1.0), delay_s=SettableRange(0.1, 20.0, 0.1))
    names = tuple(f"case {k}" for k in range(STEPS))
    excursions = replace(
        RUNS,
        severity=np.repeat(np.linspace(260, 400, STEPS)[:, None, None], 3, axis=2),
        duration_s=np.linspace(18, 0.2, STEPS)[:, None],
        names=names,
        cases=tuple(range(STEPS)),
        case_names=dict(enumerate(names)),
    )
    ladders = {
        f: ladder(replace(element, function=f), excursions) for f in (Function.OVERVOLTAGE, Function.DISPLACEMENT)
    }
    volts, deadline_s = np.linspace(265, 410, STEPS), np.linspace(19, 0.5, STEPS)
    shown = replace(
        states(volts=volts, deadline_s=deadline_s, core=np.ones(STEPS, bool)),
        severity={Function.OVERVOLTAGE: volts, Function.DISPLACEMENT: volts[::-1]},
    )
    core = np.ones(STEPS, bool)
    pools = {f: candidates(x, deadline_s) for f, x in ladders.items()}
    assert sum(map(len, pools.values())) > 64
    cover = {f: [covered_by(ladders[f], (r,), shown) for r in pool] for f, pool in pools.items()}
    first, second = cover.values()
    chosen = joint_core(ladders, (shown,), (core,))
    found = np.any([covered_by(ladders[f], rungs, shown) for f, rungs in chosen.items()], axis=0)
    assert found.sum() == max(int((a | b).sum()) for a in first for b in second)
