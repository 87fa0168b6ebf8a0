"""The highest volts of all on/off combinations at every place, and what several relays cover together."""

from typing import Any

from relaycfg.model.place_results import HighestVoltage
from relaycfg.sheet import figures
from relaycfg.sheet.ink import Flow, Ink


def combinations(ink: Ink) -> Flow:
    """One table of combinations, and one of relays where the site has several."""
    study, wording = ink.study, ink.wording
    if not study.breaks.highest:
        return [*ink.heading("combinations"), ink.say("combinations.nothing")]
    rows = [_row(ink, h) for h in study.breaks.highest]
    return [
        *ink.heading("combinations"),
        ink.say("combinations.lead", study=study),
        *ink.table(wording.lines("combinations.heads"), rows, (13, 9, 12, 7, 11, 11, 37), "lrrlrrl"),
        ink.say("combinations.reading", "small"),
        *(_together(ink) if study.together else []),
    ]


def _row(ink: Ink, h: HighestVoltage) -> list[Any]:
    bound = ink.wording.text("combinations.unbounded") if h.bound_v == float("inf") else figures.volts(h.bound_v)
    on = "; ".join(h.loads_on) or ink.wording.text("combinations.none_on")
    return [
        h.at, figures.volts(h.stiff_v), bound, h.line, figures.volts(h.impedance_v), figures.volts(h.modelled_v), on
    ]  # fmt: skip


def _together(ink: Ink) -> Flow:
    study, wording = ink.study, ink.wording
    names = [relay.name for relay in study.site.every_relay]
    unseen = wording.text("combinations.unseen")
    rows = [
        [
            t.at,
            *(figures.share(t.alone[name]) if name in t.alone else unseen for name in names),
            figures.share(t.cleared),
        ]
        for t in study.together
    ]
    shares = (22, *[78 / (len(names) + 1)] * (len(names) + 1))
    heads = [wording.text("combinations.break_at"), *names, wording.text("combinations.together")]
    return [
        *ink.heading("combinations_together", 1, wording.text("combinations.together_title")),
        ink.say("combinations.together_lead", first=names[0], others=", ".join(names[1:]), study=study),
        *ink.table(heads, rows, shares, "l" * len(shares)),
    ]
