"""What the stages of a relay see of a loose joint, and whether an alarm stage of its 59N is worth setting."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray
from relaycfg.model.joint_results import EarlyWarning, JointSight, JointSweep
from relaycfg.model.settings import Settings
from relaycfg.network import tap
from relaycfg.relay import least_sensitive
from relaycfg.study.evidence import Evidence
from relaycfg.study.joint_sweep import TRIED, Watch, heat_at, sweeps
from relaycfg.study.ladder import Ladder
from relaycfg.study.scenarios import seen_places
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage

ADVISED = "59N alarm, advised"
COMPARED = 200
"""Sampled states in which all joints are compared."""


def loose_joints(
    evidence: Evidence, settings: Settings, active: tuple[ActiveStage, ...]
) -> tuple[tuple[JointSweep, ...], EarlyWarning]:
    """Every place swept, those the relay can see with its stages and the alarm it could have; and the advice."""
    ladder = evidence.ladders.get(Function.DISPLACEMENT)
    rung = None if ladder is None else alarm_rung(ladder)
    alarm = None if ladder is None or rung is None else _advised(ladder, rung)
    tripping = [_watch(a) for a in active]
    watches = [*tripping, *_own_alarms(evidence, settings), *([alarm] if alarm else [])]
    seen = seen_places(evidence.site, evidence.relay)
    found = sweeps(
        evidence.site,
        evidence.network,
        evidence.levels.nominal,
        evidence.states,
        evidence.solved,
        dict.fromkeys(seen, watches),
    )
    found = tuple(_with_shares(evidence, s, tripping, alarm) if s.at in seen else s for s in found)
    return found, _advice(settings, found, ladder, rung)


def alarm_rung(ladder: Ladder) -> int | None:
    """The lowest rung that no standing displacement reaches, and at which each lets go again; None where none is.

    Both at the most sensitive end of the error band, with the drop-out that resets soonest.
    """
    free = np.flatnonzero(ladder.sensitive * ladder.dropout_ratio > ladder.runs.standing)
    return int(free[0]) if len(free) else None


def _advised(ladder: Ladder, rung: int) -> Watch:
    return Watch(ADVISED, ladder.element, float(ladder.insensitive[rung]), False, None)


def _watch(active: ActiveStage) -> Watch:
    every = active.stage.phases == "all"
    return Watch(active.stage.label, active.ladder.element, active.insensitive.pickup, every, active.clearing_s)


def _own_alarms(evidence: Evidence, settings: Settings) -> list[Watch]:
    """Stages that the settings themselves let give alarm only."""
    found = []
    for stage in settings.stages:
        ladder = evidence.ladders.get(stage.function)
        if stage.on and stage.action == "alarm" and ladder is not None:
            pickup = least_sensitive(ladder.element, stage).pickup
            found.append(Watch(f"{stage.label}, alarm", ladder.element, pickup, stage.phases == "all", None))
    return found


def _with_shares(evidence: Evidence, sweep: JointSweep, tripping: Sequence[Watch], alarm: Watch | None) -> JointSweep:
    """Shares of the first sampled states in which a hot joint exists that nothing picks up on."""
    site, network, relay = evidence.site, evidence.network, evidence.relay
    states = evidence.states.take(np.arange(min(COMPARED, evidence.states.count)))
    watts, solved = heat_at(network, sweep.at, evidence.levels.nominal, states, TRIED)
    taps = tap(solved, network.boards.index(relay.measures_at), relay.earth_reference)
    hot = watts >= site.judgement.hot_joint_w

    def silent(watches: Sequence[Watch]) -> BoolArray:
        picked = np.zeros(len(taps), bool)
        for watch in watches:
            picked |= watch.over(site, relay, taps) >= 0
        quiet: BoolArray = np.any(hot & ~picked.reshape(watts.shape), axis=0)
        return quiet

    unheard = None if alarm is None else share(int(silent([*tripping, alarm]).sum()), states.count)
    return replace(sweep, unseen=share(int(silent(tripping).sum()), states.count), unheard=unheard)


def _advice(settings: Settings, found: Sequence[JointSweep], ladder: Ladder | None, rung: int | None) -> EarlyWarning:
    plain = "A voltage relay is no hot-joint detector: look for heat, not for volts."
    if ladder is None:
        sentence = f"There is no displacement element to set an alarm on. {plain}"
        return EarlyWarning(None, None, None, "", False, sentence)
    standing, case = float(ladder.runs.standing), ladder.runs.standing_name
    if rung is None:
        sentence = f"No settable 59N pickup lies above the standing {standing:.1f} V ({case}). {plain}"
        return EarlyWarning(None, None, standing, case, False, sentence)
    pickup = float(ladder.pickups[rung])
    index = int(ladder.fastest()[rung])
    delay_s = float(ladder.delays[index]) if index < len(ladder.delays) else None
    pairs = [(s, *_first_two(state.sights)) for s in found for state in s.states[-1:] if state.sights]
    sooner = [(s, alarm, trip) for s, alarm, trip in pairs if alarm.seen and alarm.before_w < trip.before_w]
    free = sum(s.on for s in settings.of(Function.DISPLACEMENT)) < ladder.element.stages
    told = "".join(f"; {_spoken(s.at, alarm, trip)}" for s, alarm, trip in sooner)
    waits = "no settable delay outlasts what must hold" if delay_s is None else f"delay {delay_s:g} s"
    if not sooner:
        verdict = "Not worth setting, it alarms after no less heat than a trip"
    elif not free:
        verdict = "No stage of 59N is free for it"
    else:
        verdict = "It would chatter" if delay_s is None else "Worth setting, by the engineer's choice"
    sentence = (
        f"{verdict}: lowest settable 59N alarm {pickup:g} V{_counted(ladder)}, above the standing {standing:.1f} V "
        f"with errors, {waits}{told}. {plain}"
    )
    return EarlyWarning(pickup, delay_s, standing, case, bool(sooner) and free and delay_s is not None, sentence)


def _spoken(place: str, alarm: JointSight, trip: JointSight) -> str:
    """What burns before the alarm speaks and before the first trip."""
    trips = f"the first trip after up to {trip.before_w:.0f} W" if trip.seen else "no stage trips"
    return f"break at {place}: it alarms after up to {alarm.before_w:.0f} W in the joint, {trips}"


def _counted(ladder: Ladder) -> str:
    return " of 3V0" if ladder.element.quantity == "3v0" else ""


def _first_two(sights: Sequence[JointSight]) -> tuple[JointSight, JointSight]:
    """The advised alarm, and the tripping stage that speaks after the least heat."""
    alarm = next(s for s in sights if s.stage == ADVISED)
    trips = [s for s in sights if s.clearing_s is not None]
    first = min(trips, key=lambda s: (not s.seen, s.before_w), default=replace(alarm, seen=False, before_w=np.inf))
    return alarm, first
