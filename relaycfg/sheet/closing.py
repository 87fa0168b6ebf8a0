"""The end of the evidence: what stays closed, findings, one break by hand, cautions, sources, words, digest."""

import cmath
import math
from collections.abc import Iterator
from typing import Any

from markupsafe import Markup

from relaycfg.model.results import CaseResult, Finding
from relaycfg.model.site import Site
from relaycfg.sheet import figures
from relaycfg.sheet.decision import told
from relaycfg.sheet.ink import Flow, Ink
from relaycfg.sheet.inputs import status

SITE = "site"
"""What a figure from the site file itself names as its source."""


def closed(ink: Ink) -> Flow:
    """Harmful states no secure setting clears, by what blocks them."""
    rows: list[list[Any]] = [
        [
            Markup("<b>{}</b>").format(ink.wording.text("closed.core" if group.core else "closed.zone")),
            str(group.scenarios),
            group.sentence,
        ]
        for group in ink.study.closed
    ]
    if not rows:
        return [*ink.heading("closed"), ink.say("closed.empty")]
    heads = ink.wording.lines("closed.heads")
    return [
        *ink.heading("closed"),
        ink.say("closed.lead"),
        *ink.table(heads, rows, (8, 9, 83), "lrl"),
    ]


def findings(ink: Ink) -> Flow:
    """Findings by weight: exceptions first."""
    order = ("exception", "warning", "note")
    found: list[Finding] = sorted(ink.study.findings, key=lambda f: order.index(f.severity))
    rows = [
        [Markup("<b>{}</b>").format(f.severity) if f.exception else f.severity, told(f), f.do, f.if_left] for f in found
    ]
    said = {f.sentence for f in found}
    warnings = [ink.p(w, "item", bullet="–") for w in ink.study.site.warnings if w not in said]
    if not rows:
        return [*ink.heading("findings"), ink.say("findings.empty"), *warnings]
    heads = ink.wording.lines("findings.heads")
    return [*ink.heading("findings"), *ink.table(heads, rows, (10, 38, 30, 22), "llll"), ink.gap(3), *warnings]


def worked(ink: Ink) -> Flow:
    """One break by hand: each line's admittance, the displacement, each line's volts, beside the solver's."""
    work, wording = ink.study.worked, ink.wording
    if work is None:
        return [*ink.heading("worked"), ink.say("worked.empty")]
    names = ink.study.site.supply.geometry.names
    rows = [
        [line, figures.plain(y.real), figures.plain(y.imag), figures.by_unit(v, "V"), figures.by_unit(s, "V")]
        for line, y, v, s in zip(names, work.admittance_s, work.l_n_v, work.solver_l_n_v, strict=True)
    ]
    size, angle = abs(work.shift_v), math.degrees(cmath.phase(work.shift_v))
    path = f"{figures.plain(work.path_s.real)} {'-' if work.path_s.imag < 0 else '+'} j{abs(work.path_s.imag):.4g}"
    return [
        *ink.heading("worked"),
        ink.say("worked.lead", w=work, size=size, angle=angle, path=path if work.path_s else ""),
        *ink.table(wording.lines("worked.heads"), rows, (20, 20, 20, 20, 20), "lrrrr", width=0.75 * ink.width),
    ]


def cautions(ink: Ink) -> Flow:
    """What every sheet warns of."""
    return [*ink.heading("cautions"), *ink.items("cautions.list", study=ink.study)]


def sources(ink: Ink) -> Flow:
    """Every source of cases, inputs by default, the band and the withstand curve, each once with all it is known by."""
    found: dict[str, set[str]] = {}
    for source, code in _cited(ink.study.site, ink.study.cases):
        found.setdefault(source, set()).update({code} - {""})
    rows = []
    for source, codes in sorted(found.items()):
        known = ", ".join(status(ink, code) for code in sorted(codes)) or ink.wording.text("sources.unstated")
        rows.append([source, Markup("<b>{}</b>").format(known) if "memory" in codes else known])
    return [
        *ink.heading("sources"),
        ink.say("sources.lead"),
        *ink.table(ink.wording.lines("sources.heads"), rows, (75, 25), "ll"),
    ]


def _cited(site: Site, cases: tuple[CaseResult, ...]) -> Iterator[tuple[str, str]]:
    """Source and status of what rests on one: neither the site's own network nor a bare mention of its file."""
    band = site.supply.band_source
    if not any(i.status and i.note and band.startswith(i.note) for i in site.inputs) and band != SITE:
        yield band, site.supply.band_status
    yield site.equipment.source, site.equipment.status
    for source, code in (
        *((c.source, c.status) for c in cases if c.status != "computed"),
        (site.reference.interruption_source, site.reference.interruption_status),
    ):
        if source not in ("", SITE):
            yield source, code
    for given in site.inputs:
        note = given.note.partition("; for ")[0]
        if given.status and note:
            yield note, given.status


def glossary(ink: Ink) -> Flow:
    """The words of the sheet."""
    rows = [[Markup("<b>{}</b>").format(name), text] for name, text in ink.wording.pairs("glossary.words")]
    return [*ink.heading("glossary"), *ink.table((), rows, (18, 82), "ll")]


def digest(ink: Ink) -> Flow:
    """What identifies the inputs, the settings and the program this sheet was made with."""
    context: dict[str, Any] = {"study": ink.study, "version": ink.version}
    return [*ink.heading("digest"), ink.say("digest.lead", **context), *ink.items("digest.rows", **context)]
