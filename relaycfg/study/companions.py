"""What is no lost neutral: lost lines, a blown fuse upstream, high supply and dips, at the relay's own terminals."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from relaycfg.model.companion_results import KINDS, Companion, Companions, Confusion, Opening, Truth
from relaycfg.model.device import Function
from relaycfg.model.geometry import BoolArray, ComplexArray, FloatArray, three_phase
from relaycfg.model.site import NONE
from relaycfg.network import LoadStates, Solved, blown_fuse, open_line, tap
from relaycfg.network.states import OFF, RUNNING
from relaycfg.study.evidence import Evidence
from relaycfg.study.feeds import unable, unable_words
from relaycfg.study.own_life import floating_star
from relaycfg.study.reactions import opening_s
from relaycfg.study.reading import first_causes
from relaycfg.study.reading_words import FAULT, LOST
from relaycfg.study.scenarios import seen_places
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage

STATES = 600
"""Load states, at most, in which what is no lost neutral is read."""

NEUTRAL = "lost neutral: lines off, keep off metalwork, prove the neutral before closing"
LINE = "a line is lost: not the neutral; look for it upstream"
HIGH_SIDE = "two lines low by half: a fuse on the high-voltage side, not the neutral"
HIGH = "supply high on all lines: not the neutral"
DIP = "supply dip: not the neutral; a lasting one means a line"
SENSING = "sensing fuse or lead of one line: not the neutral; volts between lines on the board are even"
HIDDEN = "no message: the relay's own neutral wire is loose and shows every break as sound"


@dataclass(frozen=True)
class _Pattern:
    """One truth: the taps [states, lines + 1] it leaves, which of them are solved, and the volts between lines.

    ``lines`` [states, pairs] are read on the board itself, whatever the relay's own inputs have lost; supply and coil
    are fed from its ``board`` taps [states, lines + 1].
    """

    name: str
    kind: Truth
    message: str
    taps: ComplexArray
    solved: BoolArray
    lines: FloatArray
    board: ComplexArray


def companions(evidence: Evidence, active: tuple[ActiveStage, ...]) -> Companions | None:
    """Every pattern shown in its first solved state, and read in all of them; None for other than three lines."""
    if evidence.site.supply.geometry.names != three_phase().names:
        return None
    found = [p for p in _patterns(evidence) if p.solved.any()]
    return Companions(
        tuple(_shown(evidence, active, p) for p in found),
        tuple(_confusion(evidence, p, with_lines) for p in found for with_lines in (True, False)),
    )


def _patterns(evidence: Evidence) -> Iterator[_Pattern]:
    """The lost neutral at each seen place first, then what may be taken for it."""
    site, network = evidence.site, evidence.network
    nominal, names = evidence.levels.nominal, site.supply.geometry.names
    states = evidence.states.take(list(range(min(STATES, evidence.states.count))))
    third = [states.take(list(range(k, states.count, len(names)))) for k in range(len(names))]
    for place in seen_places(site, evidence.relay):
        yield _of(evidence, f"neutral lost at {place}", "lost neutral", NEUTRAL, [evidence.solved[place]])
    for words, running in (("motors off", OFF), ("motors running", RUNNING)):
        if running == RUNNING and not site.motors:
            continue
        parts = [
            network.solve(open_line(n), _with_motors(s, running), nominal) for n, s in zip(names, third, strict=True)
        ]
        yield _of(evidence, f"line lost upstream, {words}", "other", LINE, parts)
    parts = [
        network.solve(blown_fuse(n), s, _half(nominal, k)) for k, (n, s) in enumerate(zip(names, third, strict=True))
    ]
    yield _of(evidence, "high-voltage fuse blown, delta-star", "other", HIGH_SIDE, parts)
    high = nominal * site.judgement.high_shown_pu * site.supply.nominal_v / site.source.emf_v
    yield _of(evidence, "supply high, lasting", "other", HIGH, [network.solve(NONE, states, high)])
    for words, lines in (("three lines", 3), ("one line", 1), ("two lines", 2)):
        residual = np.where(np.arange(len(names)) < lines, site.judgement.dip_shown_pu, 1.0)
        yield _of(evidence, f"dip, {words}", "other", DIP, [network.solve(NONE, states, nominal * residual)])
    yield from _own_wires(evidence, network.solve(NONE, states, nominal))


def _own_wires(evidence: Evidence, sound: Solved) -> Iterator[_Pattern]:
    """What the relay's own wires make of a sound board, and of a lost neutral."""
    whole = _of(evidence, "", "other", SENSING, [sound])
    missing = whole.taps.copy()
    missing[np.arange(len(missing)), np.arange(len(missing)) % (missing.shape[1] - 1)] = 0
    yield _Pattern("sensing fuse open", "other", SENSING, missing, whole.solved, whole.lines, whole.taps)
    loose = floating_star(whole.taps)
    sound_name = "relay's own neutral loose, board sound"
    yield _Pattern(sound_name, "own wire", HIDDEN, loose, whole.solved, whole.lines, whole.taps)
    place = next(iter(seen_places(evidence.site, evidence.relay)), None)
    if place is not None:
        lost = _of(evidence, "", "own wire", HIDDEN, [evidence.solved[place]])
        name = f"the same, neutral lost at {place}"
        yield _Pattern(name, "own wire", HIDDEN, floating_star(lost.taps), lost.solved, lost.lines, lost.taps)


def _of(evidence: Evidence, name: str, kind: Truth, message: str, parts: list[Solved]) -> _Pattern:
    board = evidence.network.boards.index(evidence.relay.measures_at)
    taps = np.concatenate([tap(part, board, evidence.relay.earth_reference) for part in parts])
    converged = np.concatenate([part.converged for part in parts])
    lines = np.abs(evidence.site.supply.geometry.line_to_line(taps[:, :-1]))
    return _Pattern(name, kind, message, taps, converged, lines, taps)


def _with_motors(states: LoadStates, running: int) -> LoadStates:
    return LoadStates(states.loads, np.full_like(states.motors, running), states.names)


def _half(emf: ComplexArray, whole: int) -> ComplexArray:
    """EMFs behind a blown fuse at no load: one line whole, the two others half and opposite, in series across it."""
    found = np.full_like(emf, -emf[whole] / 2)
    found[whole] = emf[whole]
    return found


def _shown(evidence: Evidence, active: tuple[ActiveStage, ...], pattern: _Pattern) -> Companion:
    """The state of median displacement of those solved; no stage operates there while supply or coil is unfed."""
    there = np.flatnonzero(pattern.solved)
    rising = there[np.argsort(np.abs(pattern.taps[there, :-1].mean(axis=-1)), kind="stable")]
    unfed = unable(evidence, pattern.board)
    fed = rising[~unfed[rising]]
    k = int(rising[len(rising) // 2])
    seconds = opening_s(evidence, active, pattern.taps[k : k + 1])[:, 0]
    order = [j for j in np.argsort(seconds, kind="stable") if np.isfinite(seconds[j]) and not unfed[k]]
    # Which line is lost decides whether the relay is fed: 59N is asked for in a state in which it is.
    middle = [k] if not unfed[k] else [int(fed[len(fed) // 2])] if len(fed) else []
    picked = np.isfinite(opening_s(evidence, active, pattern.taps[middle]))
    l_n, l_l = np.abs(pattern.taps[k : k + 1, :-1]), pattern.lines[k : k + 1]
    nominal_v = evidence.site.supply.nominal_v
    displaced = any(a.function is Function.DISPLACEMENT and p.any() for a, p in zip(active, picked, strict=True))
    too = "where the relay is fed 59N operates" if unfed[k] else "59N operates too"
    beware = f"; {too}, so it alone proves no lost neutral" if displaced and pattern.kind == "other" else ""
    return Companion(
        pattern.name,
        pattern.kind,
        tuple(float(v) for v in l_n[0]),
        tuple(float(v) for v in l_l[0]),
        float(abs(pattern.taps[k, :-1].mean())),
        tuple(Opening(active[j].stage.label, float(seconds[j])) for j in order),
        unable_words(evidence, pattern.board[k]),
        share(int(unfed[there].sum()), len(there)),
        displaced,
        first_causes(l_n, None, nominal_v)[0],
        first_causes(l_n, l_l, nominal_v)[0],
        pattern.message + beware,
    )


def _confusion(evidence: Evidence, pattern: _Pattern, with_lines: bool) -> Confusion:
    there = pattern.solved
    l_n, l_l = np.abs(pattern.taps[there, :-1]), pattern.lines[there]
    causes = first_causes(l_n, l_l if with_lines else None, evidence.site.supply.nominal_v)
    kinds = [kind_of(cause) for cause in causes]
    named = {kind: kinds.count(kind) for kind in KINDS if kind in kinds}
    lost = int((~there).sum())
    neutral = share(named.get("lost neutral", 0), len(kinds))
    return Confusion(pattern.name, pattern.kind, with_lines, len(kinds), lost, named, neutral)


def kind_of(cause: str) -> str:
    """Which of ``KINDS`` a cause's name stands for."""
    if cause == LOST:
        return "lost neutral"
    if "fuse or test lead" in cause:
        return "fuse or lead"
    if cause.startswith(("supply ", "no supply")):
        return "supply"
    if cause.startswith("healthy"):
        return "sound or balanced"
    return "other" if cause == FAULT or "do not belong" in cause else "line"
