"""Findings, cases and blind spots as terminal text, the ones that need action first."""

from collections.abc import Sequence

from relaycfg import units
from relaycfg.model.results import CaseResult, Finding, Study
from relaycfg.text.breaks import unseen_rows
from relaycfg.text.figures import place, share
from relaycfg.text.layout import heading, listing, short, shown, table, wrapped

NAME = 30
"""Characters of a case's name in the table."""
GROUPS = 4
"""Groups of uncleared states shown."""
TITLES = {"exception": "Exceptions", "warning": "Warnings", "note": "Remarks"}


def findings(all_findings: Sequence[Finding], *severities: str) -> list[str]:
    """Findings of these severities: what, what to do, what if it is left."""
    lines: list[str] = []
    for severity in severities:
        chosen = [f for f in all_findings if f.severity == severity]
        lines += heading(f"{TITLES[severity]} ({len(chosen)})") if chosen else []
        for number, finding in enumerate(chosen, 1):
            said = not finding.about or finding.sentence.startswith(finding.about)
            about = "" if said else f"{finding.about}: "
            lines += wrapped(f"{about}{finding.sentence}", f"{number:2d}. ")
            lines += wrapped(finding.do, "    do:      ") if finding.do else []
            lines += wrapped(finding.if_left, "    if left: ") if finding.if_left else []
    return lines


def failing_cases(results: Sequence[CaseResult]) -> list[str]:
    """Cases that did not go as expected, in full."""
    failed = [c for c in results if not c.passed]
    lines = heading(f"Cases that fail ({len(failed)} of {len(results)})") if failed else []
    for case in failed:
        did = "; ".join(case.operated) or "nothing operates"
        lines += wrapped(f"case {case.number}, {case.name}: expected {case.expect}, {did}", "* ")
        lines += wrapped(f"{case.figures} [{case.source}]", "    ")
    return lines


def passing_cases(results: Sequence[CaseResult]) -> list[str]:
    """Cases that went as expected, the smallest margin first."""
    passed = sorted((c for c in results if c.passed), key=_nearness)
    heads = ["Case", "Expected", "Lowest V", "Highest V", "V0", "Left V", "Left s", "Nearest"]
    rows = [
        [
            short(f"{c.number} {c.name}", NAME),
            c.expect,
            units.volts(c.lowest_l_n_v),
            units.volts(c.highest_l_n_v),
            units.volts(c.highest_v0_v),
            units.volts(c.margin_v),
            units.seconds(c.margin_s),
            c.nearest.split(",")[0],
        ]
        for c in passed
    ]
    return [*heading(f"Cases as expected ({len(passed)} of {len(results)})"), *table(heads, rows, 2)] if passed else []


def _nearness(case: CaseResult) -> tuple[float, int]:
    return (float("inf") if case.margin_s is None else case.margin_s, case.number)


def break_classes(study: Study) -> list[str]:
    """Each place: shares of load states by harm and operation, the undetected ones first."""
    lines: list[str] = []
    for s in study.breaks.summaries:
        first = f"{place(s.at)} ({s.conductor}): harmful {share(s.harmful)}, undetected break {share(s.undetected)}"
        lines += wrapped(first + (f", unresolved {units.count(s.unresolved)}" if s.unresolved else ""))
        rows = [
            f"{_class_words(name)} {share(value)}"
            for name, value in s.classes.items()
            if value.count and name != "none / none"
        ]
        lines += wrapped("; ".join(rows), "    ") if rows else []
        if s.not_disconnected:
            lines += wrapped(f"harm the relay's switch does not disconnect: {shown(s.not_disconnected, 5)}", "    ")
    if not lines:
        return []
    note = "Shares are of modelled load states, not probabilities of damage."
    return [*heading(f"Breaks over {units.count(study.samples)} load states"), *lines, note]


def _class_words(name: str) -> str:
    harm, _, operation = name.partition(" / ")
    done = {"in time": "cleared in time", "late": "cleared late", "none": "not cleared"}.get(operation, operation)
    return f"no harm yet, {done.replace('cleared', 'tripped')}" if harm == "none" else f"{harm}, {done}"


def blind_spots(study: Study) -> list[str]:
    """What the settings do not see: places, balanced loads, states nothing clears."""
    rows = unseen_rows(study.breaks.summaries)
    lines = [*heading("Not detected")]
    lines += listing(["Place", "Wire", "Why not seen"], rows, 2) if rows else []
    hidden = [f"{place(s.at)} {share(s.undetected)}" for s in study.breaks.summaries if s.seen]
    lines += (
        wrapped(f"Load states in which a break seen from here does nothing yet: {'; '.join(hidden)}") if hidden else []
    )
    ratios = [
        f"{name} never" if k is None else f"{name} from {k:.2f}:1:1" for name, k in study.smallest_asymmetry.items()
    ]
    lines += wrapped(f"Smallest load asymmetry seen behind a stiff source: {', '.join(ratios)}") if ratios else []
    if study.never_cleared:
        lines += wrapped(f"Harmful scenarios these settings do not clear in time: {units.count(study.never_cleared)}")
    lines += [line for group in study.closed[:GROUPS] for line in wrapped(group.sentence, "* ")]
    more = len(study.closed) - GROUPS
    lines += [f"and {more} smaller groups of states that nothing clears"] if more > 0 else []
    return [*lines, *wrapped("A break with balanced load moves no voltage: no voltage relay can see it.")]


def coverage(study: Study) -> list[str]:
    """Shares of harmful states by set of elements."""
    rows = [[name, share(value)] for name, value in study.coverage.items()]
    return [*heading("Cover of the harmful states (95 %)"), *table(["Elements", "Share"], rows)] if rows else []
