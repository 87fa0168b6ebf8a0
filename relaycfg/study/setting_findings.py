"""Findings on settings: what trips on a sound supply, what the device cannot be set to, and what to turn to what."""

import numpy as np

from relaycfg.model.device import Function, SettableRange
from relaycfg.model.reconnect_results import Reconnection
from relaycfg.model.results import CaseResult, Finding
from relaycfg.model.settings import Settings, Stage
from relaycfg.study.evidence import Evidence
from relaycfg.study.margins import Security
from relaycfg.study.ride_through import ride_through
from relaycfg.study.settle import Settled
from relaycfg.study.stages import ActiveStage

NO_ELEMENT = "the device has no such element"


def turn(evidence: Evidence, old: Stage | None, new: Stage) -> str:
    """The order to act on, such as "turn U> from 253 to 265 V"."""
    element = evidence.ladders[new.function].element
    knob = element.knob or f"the {new.label} pickup"
    unit = "%" if new.function is Function.UNBALANCE or element.unit == "percent" else "V"
    to = f"{element.marked(new.pickup):g}"
    if old is None or not old.on:
        return f"switch {new.label} on: {knob} {to} {unit}, delay {new.delay_s:g} s, drop-out {new.dropout_ratio:g}"
    parts = []
    if old.pickup != new.pickup:
        parts.append(f"{knob} from {element.marked(old.pickup):g} to {to} {unit}")
    if old.delay_s != new.delay_s:
        parts.append(f"its delay from {old.delay_s:g} to {new.delay_s:g} s")
    if old.dropout_ratio != new.dropout_ratio:
        parts.append(f"its drop-out from {old.dropout_ratio:g} to {new.dropout_ratio:g}")
    for what, before, after in (
        ("reset", old.reset, new.reset),
        ("phases", old.phases, new.phases),
        ("action", old.action, new.action),
    ):
        if before != after:
            parts.append(f"its {what} from {before} to {after}")
    return f"{old.label}: turn {', '.join(parts)}" if parts else f"{old.label}: leave as it is"


def insecure(
    evidence: Evidence,
    settled: Settled,
    active: tuple[ActiveStage, ...],
    securities: dict[str, Security],
    cases: tuple[CaseResult, ...],
    existing: bool,
) -> list[Finding]:
    """Stages that trip on a sound supply, by how much, and what to turn to what."""
    found = []
    for a in active:
        secure = securities[a.stage.label]
        if secure.secure:
            continue
        unit = "%" if a.function is Function.UNBALANCE else "V"
        failed = [c for c in cases if c.expect == "hold" and any(o.stage == a.stage.label for o in c.operated)]
        more = f" and {len(failed) - 1} more case{'s' if len(failed) > 2 else ''}" if len(failed) > 1 else ""
        volts, longer = _would_hold(a)
        new = _nearest(settled.settings.of(a.function), a.stage)
        found.append(
            Finding(
                "exception",
                a.stage.label,
                f"{a.stage.label}, {a.stage.pickup:.1f} {unit} {a.stage.delay_s:g} s, trips in "
                f"{secure.seconds_case}{more}; at this delay {volts}, at this pickup {longer}",
                turn(evidence, a.stage, new) if existing and new else f"switch {a.stage.label} off",
                "it disconnects a sound supply",
            )
        )
    return found


def _would_hold(active: ActiveStage) -> tuple[str, str]:
    """The nearest settable pickup that holds at the set delay, and delay that holds at the set pickup, in words."""
    ladder, stage, band = active.ladder, active.stage, active.sensitive
    unit = "%" if stage.function is Function.UNBALANCE else "V"
    pickup = ladder.sensitive
    reach = ride_through(ladder.runs, pickup, pickup * stage.dropout_ratio, active.hold_s).seconds
    holding = np.flatnonzero((band.delay_s > reach) & (pickup > band.pickup))
    volts = f"{ladder.pickups[holding[0]]:g} {unit} would hold" if len(holding) else "no settable pickup would hold"
    here = ride_through(ladder.runs, np.array([band.pickup]), np.array([band.dropout]), active.hold_s).seconds[0]
    longer = np.flatnonzero(ladder.shortest > here)
    delay = f"{ladder.delays[longer[0]]:g} s would hold" if len(longer) else "no delay is long enough"
    return volts, delay


def _nearest(stages: tuple[Stage, ...], old: Stage) -> Stage | None:
    on = [s for s in stages if s.on]
    return min(on, key=lambda s: (abs(s.pickup - old.pickup), s.number), default=None)


def failed_cases(
    cases: tuple[CaseResult, ...], active: tuple[ActiveStage, ...], securities: dict[str, Security]
) -> list[Finding]:
    """Cases that fail though every stage that operated counts as secure, and cases that should have tripped."""
    insecure = {a.stage.label for a in active if not securities[a.stage.label].secure}
    found = []
    for case in cases:
        if case.passed:
            continue
        if case.expect == "trip" and case.outcome == "trip":
            first = case.operated[0]
            found.append(
                Finding(
                    "exception",
                    f"case {case.number}",
                    f"case {case.number}, {case.name}: opened after {first.seconds:.2f} s ({first.stage}), too late: "
                    f"{case.figures}",
                    "shorten the delay or lower the pickup of a stage that sees it",
                    "equipment stays on that voltage longer than it stands",
                )
            )
            continue
        culprits = [f"{o.stage} after {o.seconds:.2f} s" for o in case.operated if o.stage not in insecure]
        if case.outcome == "hold":
            found.append(
                Finding(
                    "exception",
                    f"case {case.number}",
                    f"case {case.number}, {case.name}: expected to trip, and no stage does",
                    "compare the case with the pickups and delays",
                    "the relay stays closed in this case",
                )
            )
        elif culprits:
            found.append(
                Finding(
                    "exception",
                    f"case {case.number}",
                    f"case {case.number}, {case.name}: {', '.join(culprits)}",
                    "raise the pickup or the delay of that stage",
                    "it disconnects a sound supply",
                )
            )
    return found


def device_limits(evidence: Evidence, settings: Settings) -> list[Finding]:
    """Settings the device does not have."""
    found = []
    for stage in settings.stages:
        ladder = evidence.ladders.get(stage.function)
        if not stage.on:
            continue
        if ladder is None:
            why = evidence.relay.device.why_off(stage.function)
            found.append(_unusable(stage, why) if why else _limit(stage, NO_ELEMENT, "remove this stage"))
            continue
        element = ladder.element
        if stage.number > element.stages:
            found.append(_limit(stage, f"the element has {element.stages} stage(s)", "remove this stage"))
            continue
        if not element.pickup.holds(stage.pickup):
            found.append(_off_step(stage, "pickup", stage.pickup, element.pickup))
        if not element.delay_s.holds(stage.delay_s):
            found.append(_off_step(stage, "delay", stage.delay_s, element.delay_s))
        if stage.dropout_ratio not in element.dropout_ratio:
            offered = ", ".join(f"{r:g}" for r in element.dropout_ratio)
            nearest = min(element.dropout_ratio, key=lambda r: abs(r - stage.dropout_ratio))
            sentence = f"drop-out {stage.dropout_ratio:g} is not one of {offered}"
            found.append(_limit(stage, sentence, f"the nearest the device has is {nearest:g}"))
    return found


def _unusable(stage: Stage, why: str) -> Finding:
    """A stage that is on although the site's system has no quantity for its element."""
    left = "it acts on a sound supply, or never, and on no lost neutral for certain"
    return Finding("exception", stage.label, f"{stage.label} is on: {why}", f"switch {stage.label} off", left)


def _off_step(stage: Stage, what: str, value: float, settable: SettableRange) -> Finding:
    span = f"{settable.low:g} to {settable.high:g} by {settable.step:g}"
    nearest = settable.values[np.argmin(np.abs(settable.values - value))]
    return _limit(stage, f"{what} {value:g} is not on {span}", f"the nearest the device has is {nearest:g}")


def _limit(stage: Stage, sentence: str, do: str) -> Finding:
    return Finding("exception", stage.label, f"{stage.label}: {sentence}", do, "it cannot be set as it stands")


def rules(evidence: Evidence, settings: Settings, existing: bool, again: Reconnection) -> list[Finding]:
    """Rules around the settings: reconnection, inputs that changed, poles."""
    found = []
    if settings.after_any_trip != "by hand":
        found.append(
            Finding(
                "exception",
                "reconnect",
                "the relay reconnects by itself: with the load off the volts look healthy, and it closes onto the "
                f"same break{_cycles(again)}",
                "set reconnection after any trip to by hand",
                "it pumps the board on and off",
            )
        )
    if existing and settings.input_digest not in ("", "sha256:0", evidence.site.digest):
        found.append(
            Finding(
                "warning",
                "inputs",
                "the settings were derived from other inputs than this site's files hold now",
                "derive again or find out what changed",
                "margins on an older sheet may no longer hold",
            )
        )
    if evidence.relay.poles == "lines and neutral" and evidence.site.conductor(evidence.relay.trips) == "PEN":
        found.append(
            Finding(
                "exception",
                "poles",
                f"the switch of {evidence.relay.trips} opens the neutral, and the incoming conductor is a PEN: a PEN "
                "is never switched",
                "place the switch behind the split of N and PE, or open the lines only",
                "protective earth would be opened with the neutral",
            )
        )
    if evidence.relay.poles == "lines":
        found.append(
            Finding(
                "note",
                "poles",
                "the switch opens the lines only: the neutral and PE stay connected to what may be live",
                "treat the board's metalwork as live until proved dead",
                "",
            )
        )
    return found


def _cycles(again: Reconnection) -> str:
    """How often it pumps, in words."""
    if not again.most_per_hour:
        return ""
    limit = "" if again.attempts is None else f", until it locks out after {again.attempts} closings"
    return f", up to {again.most_per_hour:.0f} trips an hour at {again.wait_s:g} s wait{limit}"
