"""Page 4: what to inject and what to expect, with blanks to fill in, and the commissioning record."""

from typing import Any

from relaycfg.model.results import Study
from relaycfg.model.site import NONE
from relaycfg.sheet import figures
from relaycfg.sheet.ink import GREY, HAIR, Flow, Ink


def tests(ink: Ink) -> Flow:
    """The test schedule from the settable values, then the record."""
    wording, study = ink.wording, ink.study
    rows: list[list[Any]] = [
        [
            str(number),
            point.element,
            point.line,
            point.inject,
            point.expect,
            f"{_bare(point.accept_low, point.unit)} to {figures.by_unit(point.accept_high, point.unit)}",
            "",
            "",
            point.avoid,
        ]
        for number, point in enumerate(study.tests, 1)
    ]
    blanks = [("LINEBEFORE", (6, 0), (8, -1), HAIR, GREY), ("TOPPADDING", (0, 1), (-1, -1), 4)]
    record = [
        [text, "", ""]
        for text in wording.lines("tests.record", study=study, site=study.site, connected=_connected_v0(study))
    ]
    tall = [("TOPPADDING", (0, 1), (-1, -1), 5), ("BOTTOMPADDING", (0, 1), (-1, -1), 5)]
    return [
        *ink.heading("tests"),
        ink.say("tests.lead"),
        *ink.table(wording.lines("tests.heads"), rows, (5, 11, 6, 21, 14, 14, 9, 9, 19), "rllllllll", extra=blanks),
        *ink.heading("tests_record", 1, wording.text("tests.record_title")),
        *ink.table(wording.lines("tests.record_heads"), record, (60, 25, 15), "lll", extra=tall),
        ink.say("tests.foot", "small"),
    ]


def _bare(value: float, unit: str) -> str:
    """The figure alone, rounded as its unit asks."""
    return figures.by_unit(value, unit).removesuffix(unit).rstrip()


def _connected_v0(study: Study) -> float | None:
    """V0 at the relay of the sound network with every load connected."""
    row = next((r for r in study.breaks.rows if (r.at, r.state) == (NONE, "connected")), None)
    relay = row.relays.get(study.settings.for_relay) if row else None
    return relay.v0_v if relay else None
