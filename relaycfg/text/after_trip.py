"""The relay's own life, closing again, and what is no lost neutral, as a few lines of terminal text."""

from relaycfg import units
from relaycfg.model.break_results import Share
from relaycfg.model.companion_results import Companions
from relaycfg.model.own_life_results import OwnLife
from relaycfg.model.reconnect_results import Reconnection
from relaycfg.model.results import Study
from relaycfg.text.figures import counted, place, share, together
from relaycfg.text.layout import heading, wrapped

UNSEEN = "left connected unseen"
"""The end of a course on a lost neutral that no stage sees until the loads move."""


def after_trip(study: Study) -> list[str]:
    """One sentence each: feeds, own neutral wire, closing again, what may be taken for a lost neutral."""
    sentences: list[str] = []
    if study.own_life is not None:
        sentences += [_feeds(study.own_life) + _unfed(study.companions), _sensing(study.own_life)]
    if study.reconnection is not None:
        sentences.append(_closing(study.reconnection))
    if study.companions is not None:
        sentences.append(_companions(study.companions))
    lines = [line for sentence in sentences if sentence for line in wrapped(sentence, "* ")]
    return [*heading("The relay's own wires, closing again, and what is no lost neutral"), *lines] if lines else []


def _feeds(life: OwnLife) -> str:
    if not life.feeds:
        return "Supply and coil are fed from outside the system that floats."
    volts = ", ".join(
        f"{f.what} {f.between} {units.whole_volts(f.lowest_v)} to {units.whole_volts(f.highest_v)} V"
        + (" (range not stated)" if f.allowed is None else "")
        for f in life.feeds
    )
    itself = sum(len(f.held_losses) for f in life.feeds)
    opens = f"; it opens by itself in {counted(itself, 'case')} that must hold" if itself else ""
    return f"Trip fails for supply or coil in {share(life.trip_fails)} of harmful states: {volts}{opens}."


def _unfed(found: Companions | None) -> str:
    """In how many of the patterns at the relay a feed keeps every stage from operating, and the first of them."""
    kept = [p for p in found.patterns if p.unfed] if found else []
    if found is None or not kept:
        return ""
    return f" In {len(kept)} of {len(found.patterns)} patterns no stage counts: {kept[0].name}, {kept[0].unfed}."


def _sensing(life: OwnLife) -> str:
    if life.sensing is None:
        return ""
    own = life.sensing
    alone = f"{together(own.broken_l_n_v)} V for {together(own.broken_true_v)} V"
    return (
        f"Own neutral wire loose: every break reads as the sound board does ({alone}); cleared {_of(own.cleared)} of "
        f"the harmful states instead of {_of(own.cleared_before)}."
    )


def _closing(again: Reconnection) -> str:
    if not again.pumping:
        return "Closing again: no harmful state seen from here is tripped, so nothing pumps."
    worst = max(again.pumping, key=lambda p: p.alike_per_hour)
    left = max(again.pumping, key=lambda p: p.ends.get(UNSEEN, 0))
    most = left.ends.get(UNSEEN, 0)
    ends = f"up to {most} of {again.courses} courses ({place(left.at)}) end" if most else "no course ends"
    limit = "" if again.attempts is None else f", {counted(again.attempts, 'attempt')}"
    how = f"({again.wait_s:g} s{limit})"
    opening = f"by hand after every trip; by itself {how} it would pump"
    if again.set_to == "automatic":
        opening = f"by itself as set {how} it pumps"
    return (
        f"Closing again: {opening} {worst.alike_per_hour:.0f} times an hour, {worst.chance_per_hour:.0f} by chance; "
        f"volts look healthy after {_of(again.looks_healthy)} of trips; {ends} connected, unseen."
    )


def _companions(found: Companions) -> str:
    (named, _), (alone, what) = found.named_neutral("lost neutral", True), found.named_neutral("other", False)
    with_lines, other = found.named_neutral("other", True)
    known = f"{_of(with_lines)} where they are"
    if with_lines.count and other != what:
        known = f'where they are, "{other}" in {_of(with_lines)}'
    misread = f'"{what}" is misread as one in {_of(alone)} where volts between lines are not measured, {known}'
    if not alone.count and not with_lines.count:
        misread = "nothing else is misread as one"
    others = [p for p in found.patterns if p.kind == "other"]
    also = [p.name for p in others if p.displaced]
    beware = f" 59N operates in {len(also)} of the {len(others)} others too, such as {also[0]}." if also else ""
    return f"Readings name a lost neutral first in {_of(named)} of its states; {misread}.{beware}"


def _of(value: Share) -> str:
    return f"{units.percent(value.percent)} %" if value.of else units.ABSENT
