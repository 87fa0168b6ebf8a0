"""Active stages as they act on one relay: both ends of their error bands, and when they clear a break state."""

from dataclasses import dataclass, replace

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.model.settings import Settings, Stage
from relaycfg.relay import Band, least_sensitive, most_sensitive, severities
from relaycfg.study.evidence import Evidence
from relaycfg.study.ladder import Ladder
from relaycfg.study.scenarios import Scenarios


@dataclass(frozen=True)
class ActiveStage:
    """A stage that is on, with the ladder of its element."""

    stage: Stage
    ladder: Ladder
    sensitive: Band
    insensitive: Band
    clearing_s: float

    @property
    def function(self) -> Function:
        """Function number of its element."""
        return self.stage.function

    @property
    def hold_s(self) -> float:
        """How long its count is kept through a gap."""
        return self.stage.hold_s if self.stage.reset == "held" else 0.0

    def severity(self, scenario: Scenarios, evidence: Evidence) -> FloatArray:
        """Severity [states] that decides: the worst channel, or the least one where all phases are asked for."""
        if self.stage.phases == "any":
            return scenario.severity[self.function]
        channels = severities(
            self.ladder.element, evidence.site.supply.geometry, scenario.taps, evidence.relay.device.displacement_from
        )
        least: FloatArray = channels.min(axis=-1)
        return least


def active_stages(evidence: Evidence, settings: Settings) -> tuple[ActiveStage, ...]:
    """The stages that are on and trip and whose element the device has."""
    found = []
    for stage in settings.stages:
        ladder = evidence.ladders.get(stage.function)
        if not stage.on or ladder is None or stage.action == "alarm" or stage.number > ladder.element.stages:
            continue
        if stage.phases == "all":
            ladder = replace(ladder, runs=replace(ladder.runs, every=True))
        clearing = float(ladder.clearing_of(np.array(stage.delay_s)))
        element = ladder.element
        found.append(
            ActiveStage(stage, ladder, most_sensitive(element, stage), least_sensitive(element, stage), clearing)
        )
    return tuple(found)


def operating_s(stages: tuple[ActiveStage, ...], scenario: Scenarios, evidence: Evidence) -> FloatArray:
    """Longest time [states] from the break to the open switch, over the fastest stage; inf where none operates."""
    fastest = np.full(scenario.deadline_s.shape, np.inf)
    for stage in stages:
        sees = stage.severity(scenario, evidence) >= stage.insensitive.pickup
        fastest = np.where(sees, np.minimum(fastest, stage.clearing_s), fastest)
    return fastest


def clears(active: ActiveStage, scenario: Scenarios, evidence: Evidence) -> BoolArray:
    """States [states] that this stage clears before their deadline."""
    sees = active.severity(scenario, evidence) >= active.insensitive.pickup
    in_time: BoolArray = sees & (active.clearing_s <= scenario.deadline_s) & np.isfinite(scenario.deadline_s)
    return in_time
