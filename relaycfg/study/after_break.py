"""The seconds and minutes after a break at every place the relay sees, where loads are no impedances."""

import math

import numpy as np

from relaycfg.model.after_break_results import AfterBreak, Cascade, CoursePicture, Happening, PlaceAfterBreak
from relaycfg.model.device import Function
from relaycfg.model.geometry import FloatArray
from relaycfg.model.results import Finding
from relaycfg.model.site import Site
from relaycfg.network import Network
from relaycfg.study.band_edge import band_edges
from relaycfg.study.cascade import cascades
from relaycfg.study.course_trips import earliest, stage_instants, tripping
from relaycfg.study.drift import drift
from relaycfg.study.evidence import Evidence
from relaycfg.study.fluctuation import COURSE_S, LONGEST_S, Courses, fluctuation, with_stalled
from relaycfg.study.load_volts import behind, is_electronic, mean_va
from relaycfg.study.scenarios import seen_places
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage
from relaycfg.study.third_harmonic import balanced_rectifiers

COURSES = 80
"""Courses a place, the first states of the sample."""
WORST = 3
"""States, those with the highest volts, whose cascade is followed."""
ANY = "any stage"


def after_break(evidence: Evidence, active: tuple[ActiveStage, ...]) -> AfterBreak:
    """Courses, cascades, drift, band edges and balanced rectifiers of each seen place, at nominal supply."""
    site, relay = evidence.site, evidence.relay
    places = seen_places(site, relay)
    stalling = Network(with_stalled(site))
    edges = band_edges(evidence, places, active)
    balanced = balanced_rectifiers(site, places, _displacement_pickup(active), relay.device.detector)
    states = evidence.states.take(np.arange(min(COURSES, evidence.states.count)))
    course_s = course_length_s(active)
    possible = [a.clearing_s <= course_s for a in active]
    found, picture, most = [], None, -1
    for place in places:
        courses = fluctuation(site, stalling, place, states, evidence.levels.nominal, evidence.seed, course_s)
        _, open_s = stage_instants(evidence, active, courses.taps, courses.duration_s)
        open_s = np.where(courses.unresolved, np.inf, open_s)
        any_s = earliest(open_s)
        moving = courses.fluctuating
        found.append(
            PlaceAfterBreak(
                place,
                electronic_percent(site, place),
                states.count,
                share(int(moving.sum()), states.count),
                int((moving & ~np.isfinite(any_s)).sum()),
                int(courses.unresolved.sum()),
                int(courses.several.sum()),
                tuple(tripping(a.stage.label, s, p) for a, s, p in zip(active, open_s, possible, strict=True)),
                tripping(ANY, any_s, any(possible) or not active),
                _cascades(evidence, place),
                drift(evidence, evidence.network, place, active, evidence.seed),
                edges.get(place),
                balanced.get(place),
            )
        )
        if len(courses.happened) > most and not courses.unresolved.all():
            picture, most = _picture(evidence, place, states.names, courses, active, open_s), len(courses.happened)
    return AfterBreak(course_s, tuple(found), picture)


def course_length_s(active: tuple[ActiveStage, ...]) -> float:
    """Whole seconds in which the slowest stage can clear with one to spare, between COURSE_S and LONGEST_S."""
    slowest = max((a.clearing_s for a in active), default=0.0)
    return min(max(COURSE_S, float(math.ceil(slowest + 1.0))), LONGEST_S)


def electronic_percent(site: Site, place: str) -> float:
    """Share of electronic load in what the loads to neutral behind a break take on average."""
    loads = behind(site, place)
    whole = sum(mean_va(load) for load in loads)
    return 100 * sum(mean_va(load) for load in loads if is_electronic(load)) / whole if whole else 0.0


def after_break_findings(result: AfterBreak | None, site: Site) -> list[Finding]:
    """Places with much electronic load where loads drop out and start again and no stage trips."""
    limit = 100 * site.judgement.unsteady.electronic_share
    if result is None:
        return []
    return [
        Finding(
            "warning",
            f"break at {p.at}",
            f"break at {p.at}: {p.electronic_percent:.0f} % of the load behind it is electronic; in {p.silent} of "
            f"{p.fluctuating.count} courses in which loads drop out and start again no stage trips within "
            f"{result.course_s:g} s{_too_slow(p)}",
            "a held reset, 59N within 1 s or 59 within 0.4 s where these are secure",
            "the volts wander, and a slow stage with instantaneous reset starts afresh each time",
        )
        for p in result.places
        if p.electronic_percent > limit and p.silent and p.any_stage.possible
    ]


def _too_slow(p: PlaceAfterBreak) -> str:
    """Stages that the warning leaves out, as they need longer than the courses last."""
    slow = [t.what for t in p.stages if not t.possible]
    return f" ({', '.join(slow)} cannot within that time: not counted)" if slow else ""


def _displacement_pickup(active: tuple[ActiveStage, ...]) -> float | None:
    """Lowest pickup of V0 [V] at its least sensitive end."""
    found = [
        a.insensitive.pickup / (3 if a.ladder.element.quantity == "3v0" else 1)
        for a in active
        if a.function is Function.DISPLACEMENT
    ]
    return min(found, default=None)


def _cascades(evidence: Evidence, place: str) -> tuple[Cascade, ...]:
    solved = evidence.solved[place]
    highest = np.where(solved.converged, np.abs(solved.l_n).max(axis=(0, 1)), 0.0)
    worst = np.argsort(highest, kind="stable")[::-1][:WORST]
    return cascades(evidence.site, evidence.network, place, evidence.states.take(worst), evidence.levels.nominal)


def _picture(
    evidence: Evidence,
    place: str,
    names: tuple[str, ...],
    courses: Courses,
    active: tuple[ActiveStage, ...],
    open_s: FloatArray,
) -> CoursePicture:
    """The course in which most happens, unresolved ones last; the first of several."""
    count = np.bincount([c for c, *_ in courses.happened], minlength=len(names)).astype(float)
    chosen = int(np.argmax(np.where(courses.unresolved, -1.0, count)))
    lasting = courses.duration_s[chosen] > 0
    lengths, taps = courses.duration_s[chosen][lasting], courses.taps[chosen][lasting]
    return CoursePicture(
        place,
        names[chosen],
        float(lengths.sum()),
        tuple((lengths.cumsum() - lengths).tolist()),
        tuple(tuple(row) for row in np.abs(taps[:, :-1]).tolist()),
        tuple(np.abs(evidence.site.supply.geometry.displacement(taps[:, :-1])).tolist()),
        tuple(Happening(s, load, does) for c, s, load, does in courses.happened if c == chosen),
        tuple((a.stage.label, float(s[chosen])) for a, s in zip(active, open_s, strict=True) if np.isfinite(s[chosen])),
    )
