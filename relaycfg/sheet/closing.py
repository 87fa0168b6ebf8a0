"""The end of the evidence: what stays closed, findings, one break by hand, cautions, sources, words, digest."""

import cmath
import math
from typing import Any

from markupsafe import Markup

from relaycfg.model.results import Finding
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink
from relaycfg.sheet.inputs import status


def closed(ink: Ink) -> Flow:
    """Harmful states no secure setting clears, by what blocks them."""
    rows: list[list[Any]] = [
        [
            group.place,
            str(group.states),
            ink.wording.text("closed.core" if group.core else "closed.zone"),
            figures.by_unit(group.worst_l_n_v, "V"),
            "; ".join(f"{element}: {case}" for element, case in group.blockers.items()),
            f"{figures.by_unit(group.overlap_v, 'V')}, {figures.by_unit(group.overlap_s, 's')}",
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
        *ink.table(heads, rows, (15, 7, 8, 10, 22, 13, 25), "lrlrlll"),
    ]


def findings(ink: Ink) -> Flow:
    """Findings by weight: exceptions first."""
    order = ("exception", "warning", "note")
    found: list[Finding] = sorted(ink.study.findings, key=lambda f: order.index(f.severity))
    rows = [
        [Markup("<b>{}</b>").format(f.severity) if f.exception else f.severity, f.about, f.sentence, f.do, f.if_left]
        for f in found
    ]
    warnings = [ink.p(w, "item", bullet="–") for w in ink.study.site.warnings]
    if not rows:
        return [*ink.heading("findings"), ink.say("findings.empty"), *warnings]
    heads = ink.wording.lines("findings.heads")
    return [*ink.heading("findings"), *ink.table(heads, rows, (11, 15, 30, 24, 20), "lllll"), ink.gap(3), *warnings]


def worked(ink: Ink) -> Flow:
    """One break by hand: three admittances, the displacement, three volts, beside the solver's."""
    work, wording = ink.study.worked, ink.wording
    if work is None:
        return [*ink.heading("worked"), ink.say("worked.empty")]
    names = ink.study.site.supply.geometry.names
    rows = [
        [line, figures.plain(y.real), figures.plain(y.imag), figures.by_unit(v, "V"), figures.by_unit(s, "V")]
        for line, y, v, s in zip(names, work.admittance_s, work.l_n_v, work.solver_l_n_v, strict=True)
    ]
    size, angle = abs(work.shift_v), math.degrees(cmath.phase(work.shift_v))
    return [
        *ink.heading("worked"),
        ink.say("worked.lead", w=work, size=size, angle=angle),
        *ink.table(wording.lines("worked.heads"), rows, (20, 20, 20, 20, 20), "lrrrr", width=0.75 * ink.width),
    ]


def cautions(ink: Ink) -> Flow:
    """What every sheet warns of."""
    return [*ink.heading("cautions"), *ink.items("cautions.list")]


def sources(ink: Ink) -> Flow:
    """Every source of cases, bounds, inputs by default and the withstand curve, each once."""
    study = ink.study
    found: dict[tuple[str, str], None] = {}
    for case in study.cases:
        found[case.source, case.status] = None
    found[study.site.equipment.source, study.site.equipment.status] = None
    found[study.site.supply.band_source, ""] = None
    found[study.site.reference.interruption_source, ""] = None
    for given in study.site.inputs:
        if given.status:
            found[given.note, given.status] = None
    found = dict.fromkeys(sorted(found))
    rows = [
        [source, Markup("<b>{}</b>").format(status(ink, code)) if code == "memory" else status(ink, code)]
        for source, code in found
        if source
    ]
    return [
        *ink.heading("sources"),
        ink.say("sources.lead"),
        *ink.table(ink.wording.lines("sources.heads"), rows, (75, 25), "ll"),
    ]


def glossary(ink: Ink) -> Flow:
    """The words of the sheet."""
    rows = [[Markup("<b>{}</b>").format(name), text] for name, text in ink.wording.pairs("glossary.words")]
    return [*ink.heading("glossary"), *ink.table((), rows, (18, 82), "ll")]


def digest(ink: Ink) -> Flow:
    """What identifies the inputs this sheet was made from."""
    study = ink.study
    return [*ink.heading("digest"), ink.say("digest.text", study=study, version=ink.version)]
