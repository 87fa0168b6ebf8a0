"""What sets of stages clear and see at nominal supply, both load models agreeing."""

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray
from relaycfg.model.results import Cover
from relaycfg.study.evidence import Evidence
from relaycfg.study.feeds import fed
from relaycfg.study.levels import NOMINAL
from relaycfg.study.scenarios import Scenarios
from relaycfg.study.stages import ActiveStage, clears, operating_s

SETS = {
    "59": (Function.OVERVOLTAGE,),
    "27": (Function.UNDERVOLTAGE,),
    "59 + 27": (Function.OVERVOLTAGE, Function.UNDERVOLTAGE),
    "59N": (Function.DISPLACEMENT,),
    "all": tuple(Function),
}
AS_FED = "all, as supply and coil are fed"


def cleared(stages: tuple[ActiveStage, ...], scenario: Scenarios, evidence: Evidence) -> BoolArray:
    """States [states] that some stage clears before their deadline."""
    found = np.zeros(scenario.deadline_s.shape, bool)
    for stage in stages:
        found |= clears(stage, scenario, evidence)
    return found


def coverage(evidence: Evidence, active: tuple[ActiveStage, ...]) -> tuple[Cover, ...]:
    """One row a set of elements, and one for all as they are fed where the system itself feeds relay or coil."""
    mine = {name: tuple(a for a in active if a.function in functions) for name, functions in SETS.items()}
    rows = [cover_of(evidence, name, stages) for name, stages in mine.items() if stages]
    feeds = (evidence.relay.supply, evidence.relay.trip_coil)
    if active and any(feed.between != "auxiliary" for feed in feeds):
        rows.append(cover_of(evidence, AS_FED, active, as_fed=True))
    return tuple(rows)


def cover_of(evidence: Evidence, name: str, stages: tuple[ActiveStage, ...], as_fed: bool = False) -> Cover:
    """Cover of one set; ``as_fed`` counts only states in which relay and coil have the volts they need.

    States without a solution count as harmful and not cleared, and as not seen.
    """
    nominal = [s for s in evidence.scenarios if s.level == NOMINAL]
    harmed = in_time = seen = states = 0
    for pair in zip(nominal[::2], nominal[1::2], strict=True):
        resolved = pair[0].resolved & pair[1].resolved
        # A state without a solution counts as not cleared.
        either = pair[0].harmful | pair[1].harmful | ~resolved
        both, operated = resolved.copy(), resolved.copy()
        for scenario in pair:
            working = fed(evidence, scenario) if as_fed else np.ones(len(resolved), bool)
            both &= ~scenario.harmful | (cleared(stages, scenario, evidence) & working)
            operated &= np.isfinite(operating_s(stages, scenario, evidence)) & working
        harmed += int(either.sum())
        in_time += int((either & both).sum())
        seen += int(operated.sum())
        states += len(resolved)
    return Cover(name, 100 * in_time / harmed if harmed else None, 100 * seen / states if states else 0.0)
