"""Page 1, the decision: who and what, what stays undetected, the verdict, the settings, and who signs."""

from collections.abc import Sequence
from typing import Any

from markupsafe import Markup
from reportlab.platypus import KeepInFrame

from relaycfg.model.results import Study
from relaycfg.sheet.ink import GREY, HAIR, Flow, Ink, Sketch
from relaycfg.sheet.settings_table import settings_table

SHOWN = 5
"""At most so many exceptions and blind places on this page; the rest is counted."""
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


def blind(study: Study) -> list[str]:
    """Break places that the relay cannot see, each with its reason."""
    return [f"{s.at} ({s.conductor}): {s.why_not}" for s in study.breaks.summaries if not s.seen]


def _undetected(ink: Ink) -> Flow:
    study = ink.study
    seen = [s for s in study.breaks.summaries if s.seen]
    worst = max(seen, key=lambda s: s.undetected.percent, default=None)
    relay = study.site.relay
    places = blind(study)
    return [
        ink.say("decision.undetected_title", "body"),
        *ink.items("decision.undetected", "item", study=study, worst=worst, relay=relay, blind=len(places)),
        *(ink.p(place, "item", bullet="×") for place in places[:SHOWN]),
        *_more(ink, len(places) - SHOWN, "sight"),
    ]


def _exceptions(ink: Ink) -> Flow:
    found = [f for f in ink.study.findings if f.exception]
    return [
        *(ink.p(Markup("<b>{}</b> {}").format(f.about, f.sentence), "item", bullet="!") for f in found[:SHOWN]),
        *_more(ink, len(found) - SHOWN, "findings"),
    ]


def _more(ink: Ink, count: int, key: str) -> Flow:
    """The line "and n more on page k", its page filled in when it is known."""
    if count <= 0:
        return []

    def draw(canvas: Any, width: float, _height: float) -> None:
        def write(page: int) -> str:
            return str(ink.wording.text("decision.more", count=count, page=page).striptags())

        ink.later.stamp(canvas, key, 11, 3, _SIZE, width - 30, write)

    return [Sketch(ink.width - 20, 12, draw)]


def _scope(ink: Ink) -> Flow:
    relay = ink.study.site.relay
    return [ink.say("decision.scope", "small", study=ink.study, site=ink.study.site, relay=relay)]


def counts(study: Study) -> dict[str, str]:
    """What the figures rest on, as counted; waivers are part of no input yet."""
    inputs = study.site.inputs
    return {
        "defaults": str(sum(i.tag == "default" for i in inputs)),
        "assumed": str(sum(i.tag == "assumed" for i in inputs)),
        "memory_inputs": str(sum(i.status == "memory" for i in inputs)),
        "memory_cases": str(sum(c.status == "memory" for c in study.cases)),
        "waivers": "0",
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
