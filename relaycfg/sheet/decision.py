"""Page 1, the decision: who and what, what stays undetected, the verdict, the settings, and who signs."""

from collections.abc import Sequence
from typing import Any

from markupsafe import Markup
from reportlab.platypus import KeepInFrame

from relaycfg.model.results import Finding, Study
from relaycfg.sheet import figures
from relaycfg.sheet.ink import GREY, HAIR, Flow, Ink, Sketch
from relaycfg.sheet.settings_table import settings_table

SHOWN = 5
"""At most so many exceptions and blind places on this page; the rest is counted."""
ALL = "all"
"""All elements together, as coverage names them; "all, ..." are all under a condition."""
_SIZE = 7.6


def decision(ink: Ink) -> Flow:
    """One page, always: set smaller as a whole where it would not fit."""
    study = ink.study
    document = study.site.document
    left, right = 0.62, 0.38
    page = [
        ink.heading("decision")[1],
        ink.p(Markup("<b>{}</b>").format(document.title), "title"),
        *_identity(ink),
        ink.gap(7),
        ink.boxed(_undetected(ink)),
        ink.gap(7),
        ink.say("decision.verdict", "big", study=study, exceptions=study.exceptions),
        *_exceptions(ink),
        *_warnings(ink),
        *_uncleared(ink),
        *_unexamined(ink),
        ink.gap(3),
        *settings_table(ink),
        ink.gap(6),
        ink.beside(_scope(ink), _counts(ink, (ink.width - 14) * right), left),
        ink.gap(6),
        *_roles(ink),
    ]
    return [KeepInFrame(ink.width, ink.height - 1, page, mode="shrink")]


def _identity(ink: Ink) -> Flow:
    study = ink.study
    site, document, relay = study.site, study.site.document, study.site.relay
    names = dict(ink.wording.pairs("decision.identity"))
    values = {
        "number": document.number,
        "revision": document.revision,
        "status": document.status,
        "date": document.date,
        "site": document.site,
        "supply": ink.wording.text("decision.supply", supply=site.supply),
        "relay": ink.wording.text("decision.relay", relay=relay) if relay else "–",
        "device": study.device.name,
    }
    cells = [(Markup("<b>{}</b>").format(names[key]), value) for key, value in values.items() for key in [Markup(key)]]
    rows = [[*cells[k], *cells[k + 4]] for k in range(4)]
    return ink.table((), rows, (9, 27, 8, 56), "llll")


def blind(ink: Ink) -> list[Markup]:
    """Break places that the relay cannot see, each with its reason and the share of load states that do harm."""
    return [ink.wording.text("decision.blind", s=s) for s in ink.study.breaks.summaries if not s.seen]


def _undetected(ink: Ink) -> Flow:
    study = ink.study
    seen = [s for s in study.breaks.summaries if s.seen]
    worst = max(seen, key=lambda s: s.undetected.percent, default=None)
    relay = study.site.relay
    places = blind(ink)
    return [
        ink.say("decision.undetected_title", "body"),
        *ink.items(
            "decision.undetected",
            "item",
            study=study,
            worst=worst,
            relay=relay,
            blind=len(places),
            **_lifted(study),
            **_hot_joint(study),
        ),
        *(ink.p(place, "item", bullet="×") for place in places[:SHOWN]),
        *_more(ink, len(places) - SHOWN, "sight"),
    ]


def _lifted(study: Study) -> dict[str, object]:
    """The board with the highest touch volts of those above their limit, and the break place that lifts it."""
    above = [(b, t) for t in study.touch for b in t.boards if b.above.count]
    board, at = max(above, key=lambda pair: pair[0].largest_v, default=(None, None))
    return {"lifted": board, "lifted_at": at}


def _hot_joint(study: Study) -> dict[str, object]:
    """Most watts of any joint on which no tripping stage picks up, over the places the relay sees, and its place."""
    burning = [(state.unseen_w, s.at) for s in study.breaks.joints for state in s.states if state.unseen_w is not None]
    watts, at = max(burning, default=(None, ""))
    return {"joint_w": figures.by_unit(watts, "W") if watts else "", "joint_at": at}


def _exceptions(ink: Ink) -> Flow:
    found = [f for f in ink.study.findings if f.exception]
    return [
        *(ink.p(told(f), "item", bullet="!") for f in found[:SHOWN]),
        *_more(ink, len(found) - SHOWN, "findings"),
    ]


def told(finding: Finding) -> Markup:
    """A finding's sentence with what it is about in bold, said once."""
    about, sentence = finding.about, finding.sentence
    if sentence.lower().startswith(about.lower()):
        return Markup("<b>{}</b>{}").format(sentence[: len(about)], sentence[len(about) :])
    return Markup("<b>{}</b>: {}").format(about, sentence)


def _uncleared(ink: Ink) -> Flow:
    """What these settings leave: the share of harmful states at nominal supply, and the scenarios by their cause."""
    study = ink.study
    harmful = sum(s.harmful.count for s in study.breaks.summaries if s.seen)
    covers = {c.elements: c.cleared_percent for c in study.coverage}
    alone = covers.get(ALL, 0.0)
    fed = next((percent for name, percent in covers.items() if name.startswith(f"{ALL},")), None)
    return [ink.say("decision.uncleared", "body", study=study, harmful=harmful, alone=alone, fed=fed)]


def _warnings(ink: Ink) -> Flow:
    """How many warnings the findings hold, and on which page."""
    count = sum(f.severity == "warning" for f in ink.study.findings)
    return _line(ink, "decision.warnings", "findings", 0, 8.4, count=count) if count else []


def _unexamined(ink: Ink) -> Flow:
    count = len(ink.wording.lines("sight.unexamined"))
    return _line(ink, "decision.unexamined", "sight_unexamined", 0, 8.4, count=count)


def _more(ink: Ink, count: int, key: str) -> Flow:
    """The line "and n more on page k"."""
    return _line(ink, "decision.more", key, 11, _SIZE, count=count) if count > 0 else []


def _line(ink: Ink, text: str, key: str, indent: float, size: float, **context: object) -> Flow:
    """A line from the wording that names the page of ``key``, filled in when it is known."""

    def draw(canvas: Any, width: float, _height: float) -> None:
        def write(page: int) -> str:
            return str(ink.wording.text(text, page=page, **context).striptags())

        ink.later.stamp(canvas, key, indent, 3, size, width - indent, write)

    return [Sketch(ink.width - 20, 12, draw)]


def _scope(ink: Ink) -> Flow:
    relay = ink.study.site.relay
    return [ink.say("decision.scope", "small", study=ink.study, site=ink.study.site, relay=relay)]


def counts(study: Study) -> dict[str, str]:
    """What the figures rest on, as counted."""
    inputs = study.site.inputs
    return {
        "defaults": str(sum(i.tag == "default" for i in inputs)),
        "assumed": str(sum(i.tag == "assumed" for i in inputs)),
        "memory_inputs": str(sum(i.status == "memory" for i in inputs)),
        "memory_cases": str(sum(c.status == "memory" for c in study.cases)),
        "samples": str(study.samples),
        "seed": str(study.seed),
    }


def _counts(ink: Ink, width: float) -> Flow:
    values = counts(ink.study)
    rows = [[name, values[str(key)]] for key, name in ink.wording.pairs("decision.counts")]
    return ink.table((), rows, (76, 24), "lr", width=width)


def _roles(ink: Ink) -> Flow:
    document = ink.study.site.document
    people = {
        "prepared": document.prepared,
        "checked": document.checked,
        "approved": document.approved,
        "accepted": document.accepted,
    }
    rows: list[Sequence[Any]] = [
        [Markup("<b>{}</b>").format(name), people[str(key)].name, people[str(key)].role, "", ""]
        for key, name in ink.wording.pairs("decision.roles")
    ]
    same = bool(document.checked.name) and document.checked.name == document.prepared.name
    tall = [("TOPPADDING", (0, 1), (-1, -1), 6.5), ("BOTTOMPADDING", (0, 1), (-1, -1), 3)]
    upright = [("LINEBEFORE", (1, 1), (-1, -1), HAIR, GREY)]
    return [
        *ink.table(ink.wording.lines("decision.role_heads"), rows, (13, 25, 25, 25, 12), "lllll", extra=tall + upright),
        ink.say("decision.checker", "small", same=same),
    ]
