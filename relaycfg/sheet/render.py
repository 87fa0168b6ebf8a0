"""The whole sheet: sections in their order, head and foot on every page, PDF bytes that depend on the input alone."""

import os
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from io import BytesIO
from pathlib import Path
from typing import Any

from reportlab import rl_config
from reportlab.lib.pagesizes import A4, LETTER
from reportlab.platypus import BaseDocTemplate, Frame, PageBreak, PageTemplate

from relaycfg.errors import InputError, Problem
from relaycfg.model.results import Study
from relaycfg.sheet import figures, fonts
from relaycfg.sheet.after_break import after_break
from relaycfg.sheet.aftermath import aftermath
from relaycfg.sheet.card import card
from relaycfg.sheet.closing import cautions, closed, digest, findings, glossary, sources, worked
from relaycfg.sheet.combinations import combinations
from relaycfg.sheet.corridors import corridors
from relaycfg.sheet.decision import decision
from relaycfg.sheet.derivation import derivation
from relaycfg.sheet.earthing import earthing
from relaycfg.sheet.ink import Flow, Ink, Sketch
from relaycfg.sheet.inputs import inputs, network
from relaycfg.sheet.joints import joints
from relaycfg.sheet.judged import breaks, cases
from relaycfg.sheet.later import TOTAL, line
from relaycfg.sheet.plane import plane
from relaycfg.sheet.schedule import tests
from relaycfg.sheet.sight import sight
from relaycfg.sheet.wording import Wording

rl_config.useA85 = 0  # streams as they are: a fifth smaller, and no time spent on spelling them in letters
SIDE, TOP, BOTTOM = 48.0, 56.0, 48.0
SECTIONS: dict[str, Callable[[Ink], Flow]] = {
    "decision": decision,
    "card": card,
    "sight": sight,
    "tests": tests,
    "inputs": inputs,
    "network": network,
    "derivation": derivation,
    "corridors": corridors,
    "plane": plane,
    "cases": cases,
    "breaks": breaks,
    "joints": joints,
    "earthing": earthing,
    "combinations": combinations,
    "after_break": after_break,
    "aftermath": aftermath,
    "closed": closed,
    "findings": findings,
    "worked": worked,
    "cautions": cautions,
    "sources": sources,
    "glossary": glossary,
    "digest": digest,
}


def render(study: Study, templates: Path, version: str) -> bytes:
    """The setting sheet of a study as PDF bytes; wording and order from ``templates``/sheet.

    Raises InputError for a character the typeface lacks and for a template that cannot be used.
    """
    fonts.register()
    fonts.check(_printed(study))
    paper: tuple[float, float] = A4 if study.site.document.paper == "A4" else LETTER
    width, height = paper[0] - 2 * SIDE, paper[1] - TOP - BOTTOM
    wording = Wording(templates / "sheet")
    ink = Ink(study, wording, version, width, height)
    story: Flow = []
    fresh = [str(name) for name in wording.lines("order.new_page")]
    for name in _order(wording):
        story += [PageBreak()] if name in fresh else []
        story += SECTIONS[name](ink)
    story.append(Sketch(0, 0, lambda canvas, _width, _height: ink.later.fill(canvas)))
    target = BytesIO()
    document = study.site.document
    names = {"relay": study.settings.for_relay, "site": document.site}
    sheet = BaseDocTemplate(
        target,
        pagesize=paper,
        title=document.title,
        author=document.prepared.name,
        subject=str(wording.text("frame.subject", **names).striptags()),
        creator=f"relaycfg {version}",
        lang="en",
        displayDocTitle=True,
        invariant=1,
        initialFontName=fonts.SANS,
    )
    frame = Frame(SIDE, BOTTOM, width, height, leftPadding=0, rightPadding=0, topPadding=0, bottomPadding=0)
    sheet.addPageTemplates(PageTemplate(frames=[frame], onPage=lambda canvas, _: _head_and_foot(canvas, ink, paper)))
    with _fixed_date():
        sheet.build(story)
    return target.getvalue()


@contextmanager
def _fixed_date() -> Iterator[None]:
    """Same input, same bytes: the build date of the environment is not an input."""
    given = os.environ.pop("SOURCE_DATE_EPOCH", None)
    try:
        yield
    finally:
        if given is not None:
            os.environ["SOURCE_DATE_EPOCH"] = given


def _printed(study: Study) -> dict[str, object]:
    """What of a study can reach the page, by name: all but the single break rows; fields of the site as written."""
    names = ("device", "settings", "stages", "cases", "corridors", "closed", "findings", "tests", "worked")
    parts = {name: getattr(study, name) for name in (*names, "feed_range_v", "smallest_asymmetry", "coverage")}
    parts |= {name: getattr(study, name) for name in ("own_life", "reconnection", "companions")}
    parts |= {name: getattr(study, name) for name in ("place_asymmetry", "together")}
    parts |= {"highest": study.breaks.highest}
    parts |= {"after_break": study.after_break}
    return {"": study.site, **parts, "breaks": study.breaks.summaries, "notes": study.breaks.notes}


def _order(wording: Wording) -> list[str]:
    """The sections as the order file lists them, each exactly once."""
    names = [str(name) for name in wording.lines("order.sections")]
    if sorted(names) != sorted(SECTIONS):
        odd = sorted(set(names) ^ set(SECTIONS)) or sorted({n for n in names if names.count(n) > 1})
        remedy = "list every section exactly once"
        raise InputError([Problem("order.toml", None, None, "sections", f"at odds over {', '.join(odd)}", "", remedy)])
    return names


def _head_and_foot(canvas: Any, ink: Ink, paper: tuple[float, float]) -> None:
    """Title, number, revision and status above; identity, digest, version, seed and page x of y below."""
    study, document = ink.study, ink.study.site.document
    right = paper[0] - SIDE
    top, low = paper[1] - 36, 30.0
    context = {
        "document": document,
        "inputs": figures.short(study.input_digest),
        "settings": figures.short(study.settings.digest),
        "samples": study.samples,
        "version": ink.version,
        "seed": study.seed,
    }

    def words(key: str, **more: object) -> str:
        return str(ink.wording.text(key, **context, **more).striptags())

    canvas.saveState()
    canvas.setLineWidth(0.7)
    canvas.line(SIDE, top - 5, right, top - 5)
    canvas.line(SIDE, low + 9, right, low + 9)
    line(canvas, " ".join(document.title.split()), SIDE, top, 0.48 * ink.width, 7.4, fonts.BOLD)
    line(canvas, words("frame.head_right"), SIDE + 0.5 * ink.width, top, 0.5 * ink.width, 7.4, right=True)
    line(canvas, words("frame.foot_left"), SIDE, low, 0.87 * ink.width, 6.8)
    page = canvas.getPageNumber()
    ink.later.stamp(
        canvas,
        TOTAL,
        right,
        low,
        6.8,
        0.12 * ink.width,
        lambda pages: words("frame.foot_right", page=page, pages=pages),
        True,
    )
    canvas.restoreState()
