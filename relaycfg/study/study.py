"""derive and check: the same evidence, the same judgement, on chosen or on existing settings."""

from dataclasses import replace

import numpy as np

from relaycfg.model.break_results import Harm, Operation
from relaycfg.model.cases import Case, Course, Segment
from relaycfg.model.results import PlanePoint, Study
from relaycfg.model.settings import Settings
from relaycfg.model.site import Relay, Site
from relaycfg.study.after_break import after_break
from relaycfg.study.asymmetry import smallest_asymmetry, worked_break
from relaycfg.study.breaks import break_study
from relaycfg.study.case_verdicts import case_results
from relaycfg.study.choice import harmful_states
from relaycfg.study.closed import blocked, closed_groups
from relaycfg.study.companions import companions
from relaycfg.study.corridors import corridors
from relaycfg.study.coverage import cleared, coverage
from relaycfg.study.early_warning import loose_joints
from relaycfg.study.earth_choice import earth_choice
from relaycfg.study.elsewhere import elsewhere
from relaycfg.study.evidence import Evidence, gather
from relaycfg.study.feeds import feed_ranges
from relaycfg.study.findings import findings
from relaycfg.study.levels import NOMINAL
from relaycfg.study.margins import security
from relaycfg.study.own_life import own_life
from relaycfg.study.place_asymmetry import place_asymmetries
from relaycfg.study.place_summary import HARMS
from relaycfg.study.reconnect import after_trip, reconnection
from relaycfg.study.scenarios import AS_MODELLED, Scenarios
from relaycfg.study.schedule import test_schedule
from relaycfg.study.settle import Settled, settle
from relaycfg.study.stage_results import stage_results
from relaycfg.study.stages import ActiveStage, active_stages, operating_s
from relaycfg.study.together import together
from relaycfg.study.touch import touch_voltages

PLANE_POINTS = 240
DEAD_S = 1.0


def derive(site: Site, samples: int, seed: int) -> Study:
    """Settings for a new installation with all their evidence. The site must have a relay (ValueError)."""
    evidence = gather(site, _relay(site), samples, seed)
    settled = settle(evidence)
    return _judge(evidence, settled.settings, settled, existing=False)


def check(site: Site, settings: Settings, samples: int, seed: int) -> Study:
    """Existing settings against the same evidence; what derive would choose stands behind each remedy."""
    evidence = gather(site, _relay(site), samples, seed)
    return _judge(evidence, settings, settle(evidence), existing=True)


def _relay(site: Site) -> Relay:
    if site.relay is None:
        raise ValueError("the site has no relay")
    return site.relay


def _judge(evidence: Evidence, settings: Settings, settled: Settled, existing: bool) -> Study:
    active = active_stages(evidence, settings)
    evidence = _with_energising(evidence)
    wanted = harmful_states(evidence.scenarios)
    securities = {a.stage.label: security(a) for a in active}
    cases = case_results(evidence, settings, active, securities)
    left = tuple(w & ~cleared(active, s, evidence) for s, w in zip(evidence.scenarios, wanted, strict=True))
    never = blocked(evidence, wanted)
    closed = closed_groups(evidence, never)
    joints, warning = loose_joints(evidence, settings, active)
    places = replace(break_study(evidence, active), joints=joints)
    feeds = feed_ranges(evidence)
    seats = elsewhere(evidence, active)
    unsteady = after_break(evidence, active)
    after = after_trip(evidence)
    life, again = own_life(evidence, active, after), reconnection(evidence, active, settings, after)
    return Study(
        evidence.site,
        evidence.relay.device,
        "check" if existing else "derive",
        evidence.seed,
        evidence.samples,
        settings,
        stage_results(evidence, settings, active, securities, wanted, {} if existing else settled.off_reason),
        cases,
        places,
        corridors(evidence),
        closed,
        sum(int(m.sum()) for m in left),
        sum(int((m & n).sum()) for m, n in zip(left, never, strict=True)),
        findings(
            evidence,
            settings,
            settled,
            active,
            securities,
            cases,
            left,
            closed,
            places.summaries,
            feeds,
            existing,
            life,
            again,
            seats,
            unsteady,
        ),
        test_schedule(evidence, active),
        worked_break(evidence),
        _plane(evidence, active),
        _standing_v0(evidence),
        tuple((f"{f.what}, {f.between}", f.lowest_v, f.highest_v) for f in feeds),
        smallest_asymmetry(evidence, active),
        coverage(evidence, active),
        evidence.site.digest,
        place_asymmetry=place_asymmetries(evidence, active),
        elsewhere=seats,
        together=together(evidence, active),
        early_warning=warning,
        touch=touch_voltages(evidence, active),
        earth_choice=earth_choice(evidence, active),
        own_life=life,
        reconnection=again,
        companions=companions(evidence, active),
        after_break=unsteady,
    )


def _with_energising(evidence: Evidence) -> Evidence:
    """Add the case of switching on with the neutral already open: start-up inhibits must not hide it."""
    worst: tuple[float, Scenarios | None, int] = (0.0, None, 0)
    for scenario in evidence.scenarios:
        volts = np.where(scenario.harmful & scenario.resolved, scenario.highest_v, 0.0)
        state = int(np.argmax(volts))
        if volts[state] > worst[0]:
            worst = (float(volts[state]), scenario, state)
    volts_v, scenario_, state = worst
    if scenario_ is None:
        return evidence
    dead = Segment(DEAD_S, np.zeros(scenario_.taps.shape[1], complex))
    course = Course("worst break state", (dead, Segment(float("inf"), scenario_.taps[state])))
    case = Case(
        len(evidence.cases) + 1,
        "Energising with the neutral already open",
        "trip",
        "network",
        "computed",
        False,
        (course,),
        f"break at {scenario_.place}, {volts_v:.1f} V, due within {scenario_.deadline_s[state]:g} s, supply "
        f"{scenario_.level}",
        DEAD_S,
        float(scenario_.deadline_s[state]),
    )
    return replace(evidence, cases=(*evidence.cases, case))


def _plane(evidence: Evidence, active: tuple[ActiveStage, ...]) -> tuple[PlanePoint, ...]:
    """States of each seen place at nominal supply, as modelled: those not cleared in time, then the first ones."""
    shown = [s for s in evidence.scenarios if s.level == NOMINAL and s.model == AS_MODELLED]
    each = PLANE_POINTS // max(len(shown), 1)
    points = []
    for scenario in shown:
        operated = operating_s(active, scenario, evidence)
        missed = scenario.harmful & (operated > scenario.deadline_s)
        order = np.argsort(~missed, kind="stable")
        for k in order[scenario.resolved[order]][:each]:
            harm: Harm = HARMS[int(scenario.high[k]) + 2 * int(scenario.low[k])]
            late = operated[k] > scenario.deadline_s[k]
            operation: Operation = "none" if not np.isfinite(operated[k]) else "late" if late else "in time"
            points.append(PlanePoint(complex(scenario.v0[k]), harm, operation))
    return tuple(points)


def _standing_v0(evidence: Evidence) -> float:
    """Largest V0 of the standing cases [V]; nan where the system has none."""
    taps = [s.tap for case in evidence.cases if case.standing for c in case.courses for s in c.segments]
    return max(float(abs(evidence.site.supply.geometry.displacement(t[:-1]))) for t in taps)
