"""Findings on breaks: what stays uncleared, unseen or undisconnected, and feeds that fail with the neutral."""

import numpy as np

from relaycfg.model.break_results import PlaceSummary
from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray
from relaycfg.model.own_life_results import OwnLife
from relaycfg.model.place_results import Elsewhere
from relaycfg.model.results import ClosedGroup, Finding
from relaycfg.model.settings import Settings
from relaycfg.study.coverage import cover_of
from relaycfg.study.evidence import Evidence
from relaycfg.study.feeds import FeedRange
from relaycfg.study.place_summary import TOGETHER
from relaycfg.study.scenarios import Scenarios
from relaycfg.study.setting_findings import turn
from relaycfg.study.settle import Settled
from relaycfg.study.stages import ActiveStage


def not_cleared(
    evidence: Evidence,
    settled: Settled,
    settings: Settings,
    left: tuple[BoolArray, ...],
    closed: tuple[ClosedGroup, ...],
    existing: bool,
) -> list[Finding]:
    """Core states left uncleared (exceptions), others (warnings), and states without a solution, by place."""
    found: list[Finding] = []
    first_remedy: dict[str, str] = {}
    for place in dict.fromkeys(s.place for s in evidence.scenarios):
        mine = [(s, m) for s, m in zip(evidence.scenarios, left, strict=True) if s.place == place]
        core = sum(int((m & s.core).sum()) for s, m in mine)
        wanted = sum(int((s.harmful & s.core & s.resolved).sum()) for s, _ in mine)
        harmful = sum(int((s.harmful & s.resolved).sum()) for s, _ in mine)
        zone = sum(int((m & ~s.core).sum()) for s, m in mine)
        lost = sum(int((~s.resolved).sum()) for s, _ in mine)
        if core:
            worst, deadline = _worst_left(mine)
            remedy = _what_clears(evidence, settled, settings, place, closed, existing)
            if remedy in first_remedy:
                remedy = f"the same changes as for the break at {first_remedy[remedy]}"
            else:
                first_remedy[remedy] = place
            found.append(
                Finding(
                    "exception",
                    f"break at {place}",
                    f"break at {place}: {core} of {wanted} core scenarios not cleared in time, up to "
                    f"{worst:.0f} V line to neutral, due within {deadline:g} s",
                    remedy,
                    "equipment stays on that voltage longer than it stands",
                )
            )
        if zone:
            found.append(
                Finding(
                    "warning",
                    f"break at {place}",
                    f"break at {place}: {zone} of {harmful - wanted} scenarios between the sustained voltage and the "
                    "first point of the withstand curve not cleared in time",
                    "accept it in writing, or look at what blocks them",
                    "equipment may age or trip by itself",
                )
            )
        if lost:
            found.append(
                Finding(
                    "exception",
                    f"break at {place}",
                    f"break at {place}: {_scenarios(lost)} without a solution the program could find; they count as "
                    "not cleared",
                    "check the load kinds of the loads that are on in these states",
                    "nothing is known of these states",
                )
            )
    return found


def useless_stages(evidence: Evidence, active: tuple[ActiveStage, ...]) -> list[Finding]:
    """Stages that are on and clear nothing in time."""
    found = []
    for a in active:
        cover = cover_of(evidence, a.stage.label, (a,))
        if cover.cleared_percent == 0:
            found.append(
                Finding(
                    "warning",
                    a.stage.label,
                    f"{a.stage.label} clears no harmful state in time; seen: {cover.seen_percent:.1f} % of all states",
                    "lower its pickup or its delay, or switch it off knowingly",
                    "it adds nothing against a lost neutral",
                )
            )
    return found


def _scenarios(count: int) -> str:
    return "1 scenario" if count == 1 else f"{count} scenarios"


def _worst_left(mine: list[tuple[Scenarios, BoolArray]]) -> tuple[float, float]:
    worst, deadline = 0.0, np.inf
    for scenario, mask in mine:
        core = mask & scenario.core
        if core.any():
            worst = max(worst, float(scenario.highest_v[core].max()))
            deadline = min(deadline, float(scenario.deadline_s[core].min()))
    return worst, deadline


def _what_clears(
    evidence: Evidence,
    settled: Settled,
    settings: Settings,
    place: str,
    closed: tuple[ClosedGroup, ...],
    existing: bool,
) -> str:
    """For existing settings, the derived stages that differ; for derived ones, what blocks."""
    if existing:
        orders = []
        for new in settled.settings.active:
            old = next((s for s in settings.of(new.function) if s.number == new.number), None)
            if old != new:
                orders.append(turn(evidence, old, new))
        if orders:
            return "; ".join(orders)
    blocked = [g for g in closed if g.place == place and g.core]
    if blocked:
        return f"no secure setting exists for {sum(g.scenarios for g in blocked)} of them: {blocked[0].sentence}"
    return "each could be cleared by itself, but not all by the stages this device has: use a device with more stages"


def blind(evidence: Evidence, settings: Settings, active: tuple[ActiveStage, ...]) -> list[Finding]:
    """Settings that no lost neutral can reach: line-to-line only, nothing on, all phases asked for."""
    found = []
    if active and all(a.ladder.element.line_to_line_only for a in active):
        found.append(
            Finding(
                "exception",
                "measurement",
                "every active element measures line to line: the relay cannot see a lost neutral anywhere",
                "use a device that measures line to neutral or neutral displacement",
                "no neutral break is disconnected",
            )
        )
    if not active:
        found.append(
            Finding(
                "exception",
                "settings",
                "no stage is on and trips",
                "switch on the stages that derive chooses",
                "no neutral break is disconnected",
            )
        )
    for a in active:
        if a.stage.phases == "all" and a.function in (Function.OVERVOLTAGE, Function.UNDERVOLTAGE):
            found.append(
                Finding(
                    "exception",
                    a.stage.label,
                    f"{a.stage.label} asks for all phases: a lost neutral raises some and lowers others",
                    f"set {a.stage.label} to any phase",
                    "this stage never sees a lost neutral",
                )
            )
    if settings.for_relay != evidence.relay.name:
        found.append(
            Finding(
                "warning",
                "settings",
                f"the settings are for relay {settings.for_relay}, the site has {evidence.relay.name}",
                "check that the file belongs to this relay",
                "the wrong relay may be judged",
            )
        )
    return found


def floating_feeds(feeds: tuple[FeedRange, ...], life: OwnLife) -> list[Finding]:
    """Supplies and coils that the lost neutral takes out of their working range."""
    found = []
    for feed in feeds:
        if feed.allowed is None:
            found.append(
                Finding(
                    "warning",
                    feed.what,
                    f"{feed.what} is fed {feed.between} and its range is not stated: {feed.lowest_v:.0f} to "
                    f"{feed.highest_v:.0f} V over the break states",
                    "state range_v, or feed it from an auxiliary source",
                    "nobody knows whether it works while the neutral is lost",
                )
            )
        if feed.allowed is None or feed.failing == 0:
            continue
        low, high = feed.allowed
        percent = 100 * feed.failing / feed.harmful if feed.harmful else 0.0
        found.append(
            Finding(
                "exception",
                feed.what,
                f"{feed.what} is fed {feed.between} from the floating system: {feed.lowest_v:.0f} to "
                f"{feed.highest_v:.0f} V over the break states, outside its {low:g} to {high:g} V in "
                f"{percent:.1f} % of the harmful scenarios",
                _better_fed(life),
                "the relay decides and nothing opens",
            )
        )
    return found


def _better_fed(life: OwnLife) -> str:
    """An auxiliary feed, or a self-opening one with what it would leave."""
    if any(f.opens_itself for f in life.feeds):
        return "feed it from an auxiliary source"
    left, of = life.self_opening_fails.count, life.self_opening_fails.of
    return (
        "feed it from an auxiliary source, or use an undervoltage release behind an output that is energised while "
        f"healthy: at nominal supply that would leave {left} of {of} harmful states, and open in dips"
    )


def opened_by_release(life: OwnLife) -> list[Finding]:
    """A release that opens the switch in cases that must hold."""
    found = []
    for feed in life.feeds:
        if not feed.held_losses:
            continue
        deepest = min(feed.held_losses, key=lambda h: h.lowest_v)
        cases = ", ".join(str(h.case) for h in feed.held_losses)
        found.append(
            Finding(
                "exception",
                feed.what,
                f"{feed.what} is fed {feed.between} and opens the switch by itself in {len(feed.held_losses)} cases "
                f"that must hold ({cases}), down to {deepest.lowest_v:.0f} V",
                "feed it from an auxiliary source that rides through, or delay the release beyond these cases",
                "it disconnects a sound supply, whatever the settings",
            )
        )
    return found


EARTH_APART = (
    "measure N against an electrode outside the influence of all others (earth_reference), or take displacement from "
    "the lines"
)


def places_findings(places: tuple[PlaceSummary, ...], elsewhere: tuple[Elsewhere, ...]) -> list[Finding]:
    """Places the relay cannot see, and boards its switch does not disconnect; where another relay would have to sit.

    A place that another relay of the site sees is a note.
    """
    found = []
    seats = {one.at: one for one in elsewhere}
    for place in places:
        seat = seats.get(place.at)
        if not place.seen:
            watched = seat is not None and bool(seat.relays)
            found.append(
                Finding(
                    "note" if watched else "warning",
                    f"break at {place.at}",
                    f"break at {place.at} is not seen: {place.why_not}",
                    EARTH_APART
                    if place.why_not == TOGETHER
                    else _where_to_sit(seat, "place a relay at a board behind that break"),
                    f"{place.harmful.percent:.1f} % of the load states harm equipment there",
                )
            )
        elif place.not_disconnected:
            found.append(
                Finding(
                    "warning",
                    f"break at {place.at}",
                    f"break at {place.at} also harms {', '.join(place.not_disconnected)}, which this relay does not "
                    "disconnect",
                    _where_to_sit(seat, "place a relay there too"),
                    "equipment there stays on the shifted volts",
                )
            )
    return found


def _where_to_sit(seat: Elsewhere | None, unknown: str) -> str:
    """The board where the same device and settings would clear most of the harmful states of a break."""
    if seat is None or not seat.best.cleared.of:
        return f"{unknown}, or accept it in writing"
    if seat.relays:
        return f"judge {', '.join(seat.relays)}, which {'sees' if len(seat.relays) == 1 else 'see'} it (--relay)"
    best = seat.best
    if best.cleared.count == 0:
        return (
            f"place a relay behind that break with settings of its own (the same ones clear nothing at {best.board}), "
            "or accept it in writing"
        )
    return (
        f"place a relay at {best.board} that opens it (the same device and settings would clear "
        f"{best.cleared.percent:.1f} % of the harmful states in time; derive them anew there), or accept it in writing"
    )
