"""Findings: every exception, warning and note in order, with what to do and what happens if it is left."""

from relaycfg.model.after_break_results import AfterBreak
from relaycfg.model.break_results import PlaceSummary
from relaycfg.model.geometry import BoolArray
from relaycfg.model.own_life_results import OwnLife
from relaycfg.model.place_results import Elsewhere
from relaycfg.model.reconnect_results import Reconnection
from relaycfg.model.results import CaseResult, ClosedGroup, Finding
from relaycfg.model.settings import Settings
from relaycfg.study.after_break import after_break_findings
from relaycfg.study.break_findings import (
    blind,
    floating_feeds,
    not_cleared,
    opened_by_release,
    places_findings,
    useless_stages,
)
from relaycfg.study.earth_choice import earth_findings
from relaycfg.study.evidence import Evidence
from relaycfg.study.feeds import FeedRange
from relaycfg.study.margins import Security
from relaycfg.study.setting_findings import device_limits, failed_cases, insecure, rules
from relaycfg.study.settle import Settled
from relaycfg.study.stages import ActiveStage


def findings(
    evidence: Evidence,
    settings: Settings,
    settled: Settled,
    active: tuple[ActiveStage, ...],
    securities: dict[str, Security],
    cases: tuple[CaseResult, ...],
    left: tuple[BoolArray, ...],
    closed: tuple[ClosedGroup, ...],
    places: tuple[PlaceSummary, ...],
    feeds: tuple[FeedRange, ...],
    existing: bool,
    life: OwnLife,
    again: Reconnection,
    seats: tuple[Elsewhere, ...] = (),
    unsteady: AfterBreak | None = None,
) -> tuple[Finding, ...]:
    """All findings, exceptions first; ``existing`` settings also get what to turn to what."""
    found = [
        *(device_limits(evidence, settings) if existing else ()),
        *insecure(evidence, settled, active, securities, cases, existing),
        *failed_cases(cases, active, securities),
        *not_cleared(evidence, settled, settings, left, closed, existing),
        *blind(evidence, settings, active),
        *(useless_stages(evidence, active) if existing else ()),
        *floating_feeds(feeds, life),
        *opened_by_release(life),
        *rules(evidence, settings, existing, again),
        *earth_findings(evidence, active),
        *places_findings(places, seats),
        *after_break_findings(unsteady, evidence.site),
        *_warnings(evidence),
    ]
    order = {"exception": 0, "warning": 1, "note": 2}
    return tuple(sorted(found, key=lambda f: order[f.severity]))


def _warnings(evidence: Evidence) -> list[Finding]:
    return [Finding("warning", "site", w, "check the site file", "") for w in evidence.site.warnings]
