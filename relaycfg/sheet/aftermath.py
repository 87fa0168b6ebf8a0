"""After a trip: what to prove, what closing by itself would do, and what looks like a lost neutral and is none."""

from typing import Any

from markupsafe import Markup

from relaycfg.model.companion_results import KINDS, Companion, Companions, Confusion
from relaycfg.model.reconnect_results import Pumping, Reconnection
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink


def aftermath(ink: Ink) -> Flow:
    """The rule of closing first, then the relay's own wires, then the patterns and how surely they are told apart."""
    study = ink.study
    return [
        *ink.heading("aftermath"),
        *(() if study.reconnection is None else _closing(ink, study.reconnection)),
        *_own(ink),
        *(() if study.companions is None else _patterns(ink, study.companions)),
    ]


def _closing(ink: Ink, again: Reconnection) -> Flow:
    words = ink.wording
    rows = [_pumping(p) for p in again.pumping]
    asked: list[list[Any]] = [[c.asks, Markup("<b>{}</b>").format(c.met), c.because] for c in again.conditions]
    return [
        ink.boxed([ink.say("aftermath.rule", again=again)]),
        ink.gap(4),
        ink.say("aftermath.prove_lead"),
        *ink.items("aftermath.prove", "tight"),
        *ink.heading("aftermath_pumping", 1, words.text("aftermath.pumping_title")),
        ink.say("aftermath.pumping_lead", again=again, healthy=figures.share(again.looks_healthy)),
        *(
            ink.table(words.lines("aftermath.pumping_heads"), rows, (15, 9, 9, 14, 9, 11, 13, 10, 10, 20), "lcrlrrrrrl")
            if rows
            else [ink.say("aftermath.nothing_pumps")]
        ),
        *ink.heading("aftermath_conditions", 1, words.text("aftermath.conditions_title")),
        *ink.table(words.lines("aftermath.conditions_heads"), asked, (38, 10, 52), "lll"),
    ]


def _pumping(p: Pumping) -> list[str]:
    ends = ", ".join(f"{count} {how}" for how, count in p.ends.items() if count)
    return [
        p.at,
        p.start,
        figures.by_unit(p.highest_v, "V"),
        p.first_stage,
        figures.by_unit(p.trip_s, "s"),
        f"{p.alike_per_hour:.0f}",
        f"{p.chance_per_hour:.0f} ({p.chance_most})",
        f"{p.harmful_closings:.0f}",
        figures.by_unit(p.on_voltage_s, "s"),
        ends,
    ]


def _own(ink: Ink) -> Flow:
    life = ink.study.own_life
    if life is None:
        return []
    flow = [*ink.heading("aftermath_own", 1, ink.wording.text("aftermath.own_title"))]
    if life.sensing is not None:
        own = life.sensing
        flow.append(
            ink.say(
                "aftermath.sensing",
                own=own,
                sound=_volts(own.sound_l_n_v),
                lost=_volts(own.broken_true_v),
                read=_volts(own.broken_l_n_v),
                fed=_volts(own.fed_l_n_v or ()),
                operates=", ".join(own.fed_operates),
                cleared=figures.share(own.cleared),
                before=figures.share(own.cleared_before),
            )
        )
    poles = life.poles
    early = "" if poles.early_harmful is None else figures.share(poles.early_harmful)
    return [*flow, ink.say("aftermath.poles", poles=poles, early=early, relay=ink.study.site.relay)]


def _patterns(ink: Ink, found: Companions) -> Flow:
    words = ink.wording
    truths = list(dict.fromkeys(c.truth for c in found.confusion))
    return [
        *ink.heading("aftermath_patterns", 1, words.text("aftermath.patterns_title")),
        ink.say("aftermath.patterns_lead", judgement=ink.study.site.judgement),
        *ink.table(
            words.lines("aftermath.patterns_heads"),
            [_pattern(ink, p) for p in found.patterns],
            (18, 14, 14, 7, 15, 17, 23),
            "lrrrlll",
        ),
        *ink.heading("aftermath_confusion", 1, words.text("aftermath.confusion_title")),
        ink.say("aftermath.confusion_lead"),
        *ink.table(
            [words.text("aftermath.confusion_head"), *KINDS, *words.lines("aftermath.confusion_ends")],
            [_confused(truth, [c for c in found.confusion if c.truth == truth]) for truth in truths],
            (24, 12, 12, 12, 12, 13, 12, 7, 12),
            "lrrrrrrrr",
        ),
    ]


def _pattern(ink: Ink, p: Companion) -> list[Any]:
    name = p.name if p.kind == "other" else Markup("<b>{}</b>").format(p.name)
    stages = [f"{o.stage} {figures.seconds(o.seconds)} s" for o in p.operates]
    some = ink.wording.text("aftermath.unfed", share=figures.percent(p.unfed_share.percent))
    # The state shown may be fed where others of the same pattern are not.
    feeds = [p.unfed] if p.unfed else [some] if p.unfed_share.count else []
    operates = ", ".join([*stages, *feeds]) or figures.ABSENT
    volts = figures.by_unit(p.v0_v, "V")
    return [name, _volts(p.l_n_v), _volts(p.l_l_v), volts, operates, p.read_with_lines, p.message]


def _confused(truth: str, rows: list[Confusion]) -> list[Any]:
    """Percent named first, with the volts between lines and without."""
    rows = sorted(rows, key=lambda c: not c.with_lines)
    cells: list[Any] = [truth]
    for kind in KINDS:
        cells.append(" / ".join(figures.percent(100 * c.named.get(kind, 0) / c.of if c.of else None) for c in rows))
    return [*cells, str(rows[0].of), str(rows[0].unresolved)]


def _volts(values: tuple[float, ...]) -> str:
    return " / ".join(f"{v:.0f}" for v in values)
