"""Active stages as they act on one relay: both ends of their error bands, and when they clear a break state."""

from dataclasses import dataclass, replace

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray, FloatArray
from relaycfg.model.settings import Settings, Stage
from relaycfg.relay import Band, least_sensitive, most_sensitive, severities
from relaycfg.study.evidence import Evidence, ladder_of
from relaycfg.study.ladder import Ladder
from relaycfg.study.scenarios import Scenarios


@dataclass(frozen=True)
class ActiveStage:
    """A stage that is on, with the ladder of its element as the setting counts it."""

    stage: Stage
    ladder: Ladder
    sensitive: Band
    insensitive: Band
    clearing_s: float

    @property
    def function(self) -> Function:
        """Function number of its element."""
        return self.stage.function

    def severity(self, scenario: Scenarios, evidence: Evidence) -> FloatArray:
        """Severity [states] that decides: the worst channel, or the least one where all phases are asked for."""
        device_element = evidence.ladders[self.function].element
        if self.stage.phases == "any" and self.ladder.element == device_element:
            return scenario.severity[self.function]
        channels = severities(
            self.ladder.element, evidence.site.supply.geometry, scenario.taps, evidence.relay.device.displacement_from
        )
        worst: FloatArray = channels.min(axis=-1) if self.stage.phases == "all" else channels.max(axis=-1)
        return worst


def active_stages(evidence: Evidence, settings: Settings, alarms: bool = False) -> tuple[ActiveStage, ...]:
    """The stages that are on and trip (``alarms``: those that only signal) and whose element the device has."""
    found = []
    for stage in settings.stages:
        ladder = evidence.ladders.get(stage.function)
        if not stage.on or ladder is None or (stage.action == "alarm") != alarms:
            continue
        if stage.quantity and stage.quantity != ladder.element.quantity:
            element = replace(ladder.element, quantity=stage.quantity)
            ladder = ladder_of(evidence.site, evidence.relay, evidence.cases, element)
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
