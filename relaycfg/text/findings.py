"""Findings, cases and blind spots as terminal text, the ones that need action first."""

from collections.abc import Sequence

from relaycfg import units
from relaycfg.model.results import CaseResult, Finding, Study
from relaycfg.text.breaks import unseen_rows
from relaycfg.text.figures import cited, class_words, counted, operated, or_dash, place, share
from relaycfg.text.layout import heading, listing, shown, table, wrapped

GROUPS = 4
"""Groups of uncleared states shown."""
TITLES = {"exception": "Exceptions", "warning": "Warnings", "note": "Remarks"}
DO = "    do:      "


def findings(all_findings: Sequence[Finding], *severities: str) -> list[str]:
    """Findings of these severities: what, what to do, what if it is left; an order already given is not repeated."""
    lines: list[str] = []
    for severity in severities:
        chosen = [f for f in all_findings if f.severity == severity]
        lines += heading(f"{TITLES[severity]} ({len(chosen)})") if chosen else []
        given: dict[str, int] = {}
        for number, finding in enumerate(chosen, 1):
            said = not finding.about or finding.sentence.startswith(finding.about)
            about = "" if said else f"{finding.about}: "
            lines += wrapped(f"{about}{finding.sentence}", f"{number:2d}. ")
            lines += _orders(finding.do, number, given)
            lines += wrapped(finding.if_left, "    if left: ") if finding.if_left else []
    return lines


def _orders(do: str, number: int, given: dict[str, int]) -> list[str]:
    """What to do, each order once: ``given`` holds those of this list and the finding that gave them."""
    parts = do.split("; ")
    orders = parts if all("turn " in p or p.startswith("switch ") for p in parts) else [do]
    new = [order for order in orders if order not in given]
    before = sorted({given[order] for order in orders if order in given})
    given |= dict.fromkeys(new, number)
    as_before = f"as for {' and '.join(map(str, before))}" if before else ""
    return wrapped("; ".join([*([as_before] if before else []), *new]), DO) if do else []


def failing_cases(results: Sequence[CaseResult]) -> list[str]:
    """Cases that did not go as expected, in full."""
    failed = [c for c in results if not c.passed]
    lines = heading(f"Cases that fail ({len(failed)} of {len(results)})") if failed else []
    for case in failed:
        lines += wrapped(f"case {case.number}, {case.name}: expected {case.expect}, {operated(case)}", "* ")
        lines += wrapped(f"{case.figures}{cited(case.source, case.status)}", "    ")
    return lines


def passing_cases(results: Sequence[CaseResult]) -> list[str]:
    """Cases that went as expected, the smallest margin first, with the stages that margin is of."""
    passed = sorted((c for c in results if c.passed), key=_nearness)
    heads = ["Case", "Expect", "Low V", "High V", "V0", "Left V", "of", "Left s", "of"]
    rows = [
        [
            f"{c.number} {c.name}",
            c.expect,
            units.volts(c.lowest_l_n_v),
            units.volts(c.highest_l_n_v),
            units.volts(c.highest_v0_v),
            units.volts(c.margin_v),
            _stage(c.nearest_v),
            units.seconds(c.margin_s),
            _stage(c.nearest_s),
        ]
        for c in passed
    ]
    return [*heading(f"Cases as expected ({len(passed)} of {len(results)})"), *table(heads, rows, 2)] if passed else []


def _stage(nearest: str) -> str:
    """The stage's label without what is said about it."""
    return or_dash(nearest.split(",")[0])


def _nearness(case: CaseResult) -> tuple[float, int]:
    return (float("inf") if case.margin_s is None else case.margin_s, case.number)


def break_classes(study: Study) -> list[str]:
    """Each place: shares of load states by harm and operation, the undetected ones first."""
    lines: list[str] = []
    for s in study.breaks.summaries:
        hidden = f"undetected {share(s.undetected)}" if s.seen else "not seen"
        first = f"{place(s.at)} ({s.conductor}): harmful {share(s.harmful)}, {hidden}"
        lines += wrapped(first + (f", unresolved {units.count(s.unresolved)}" if s.unresolved else ""))
        rows = [
            f"{class_words(name)} {share(value)}"
            for name, value in s.classes.items()
            if value.count and name != "none / none"
        ]
        lines += wrapped("; ".join(rows), "    ") if rows else []
        if s.not_disconnected:
            lines += wrapped(f"harm the relay's switch does not disconnect: {shown(s.not_disconnected, 5)}", "    ")
    if not lines:
        return []
    note = (
        "Undetected: no harm and no operation under at least one load model; the classes take both load "
        "models together: harmed under either, cleared under each that harms. Shares are of modelled load states, not "
        "probabilities of damage."
    )
    return [*heading(f"Breaks over {units.count(study.samples)} load states"), *lines, *wrapped(note)]


def blind_spots(study: Study) -> list[str]:
    """What the settings do not see: places, balanced loads, states nothing clears; what a finding says, only named."""
    geometry = study.site.supply.geometry
    said = "\n".join(f"{f.sentence}\n{f.do}" for f in study.findings)
    unseen = [s for s in study.breaks.summaries if not s.seen]
    rows = unseen_rows([s for s in unseen if s.why_not not in said])
    named = ", ".join(place(s.at) for s in unseen if s.why_not in said)
    lines = [*heading("Not detected")]
    lines += listing(["Place", "Wire", "Why not seen"], rows, 2) if rows else []
    lines += wrapped(f"Breaks not seen from here, the warnings say why: {named}.") if named else []
    seen = [f"{place(s.at)} {share(s.undetected)}" for s in study.breaks.summaries if s.seen]
    undetected = "Undetected, no harm and no operation under at least one load model, of breaks seen from here"
    lines += wrapped(f"{undetected}: {'; '.join(seen)}") if seen else []
    ratios = [
        f"{name} never" if k is None else f"{name} from {units.load_ratio(k, len(geometry.names))}"
        for name, k in study.smallest_asymmetry.items()
    ]
    lines += wrapped(f"Smallest load asymmetry seen behind a stiff source: {', '.join(ratios)}") if ratios else []
    lines += wrapped(_uncleared(study)) if study.uncleared else []
    new = [group.sentence for group in study.closed if group.sentence not in said]
    lines += [line for sentence in new[:GROUPS] for line in wrapped(sentence, "* ")]
    more = len(new) - GROUPS
    lines += [f"and {counted(more, 'smaller group')} that nothing clears"] if more > 0 else []
    return [*lines, *wrapped(_equal_load(study))]


def _equal_load(study: Study) -> str:
    """What a break with equal loads does: nothing, but for two lines of a star."""
    supply = study.site.supply
    if supply.geometry.has_displacement:
        return "A break with balanced load moves no voltage: no voltage relay can see it."
    half = units.with_unit(supply.nominal_v * supply.geometry.line_to_line_ratio / 2, "V")
    return f"A break with equal load puts {half} on either line, half the volts between them: only a 27 above sees it."


def _uncleared(study: Study) -> str:
    """How many harmful scenarios stay uncleared, and why."""
    others = study.uncleared - study.blocked
    one = others == 1
    left = f"{'was' if one else 'were'} given up for security margin or {'is' if one else 'are'} not set"
    if not others:
        why = f"no secure setting clears {'it' if study.uncleared == 1 else 'them'}"
    elif not study.blocked:
        why = f"{'it' if one else 'they'} {left}"
    else:
        blocked = f"{units.count(study.blocked)} of them no secure setting clears"
        why = f"{blocked}, the {'other' if one else 'others'} {left}"
    return f"Not cleared in time: {counted(study.uncleared, 'harmful scenario')}; {why}."


def coverage(study: Study) -> list[str]:
    """What each set of elements clears of the harmful states, and in which of all states it operates."""
    if not study.coverage:
        return []
    heads = ["Elements", "Harmful states cleared in time", "All states in which it operates"]
    rows = [
        [c.elements, units.with_unit(c.cleared_percent, "%"), units.with_unit(c.seen_percent, "%")]
        for c in study.coverage
    ]
    return [*heading("Cover at nominal supply, over the places seen"), *table(heads, rows)]
