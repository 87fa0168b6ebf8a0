"""The relay's own life while the neutral is lost: its feeds, its own neutral wire, the poles of its switch."""

import numpy as np

from relaycfg.model.break_results import Share
from relaycfg.model.geometry import ComplexArray
from relaycfg.model.own_life_results import OwnLife, Poles, SensingNeutral
from relaycfg.model.site import NONE
from relaycfg.network import Solved, connected, tap
from relaycfg.study.coverage import cleared
from relaycfg.study.deadlines import high_deadline_s
from relaycfg.study.evidence import Evidence
from relaycfg.study.feeds import feed_lives, trip_shares
from relaycfg.study.levels import NOMINAL
from relaycfg.study.load_volts import other_users
from relaycfg.study.reactions import as_read, opening_s
from relaycfg.study.scenarios import Scenarios
from relaycfg.study.shares import share
from relaycfg.study.stages import ActiveStage


def own_life(evidence: Evidence, active: tuple[ActiveStage, ...], after: dict[str, Solved]) -> OwnLife:
    """Feeds, sensing neutral and poles; ``after`` holds each seen place with everything behind the switch off."""
    fails, self_opening = trip_shares(evidence)
    return OwnLife(
        feed_lives(evidence, active), fails, self_opening, _sensing(evidence, active), _poles(evidence, after)
    )


def floating_star(taps: ComplexArray) -> ComplexArray:
    """What three equal inputs read of taps [states, lines + 1] once their common neutral wire is loose.

    The star of the inputs carries no current to anywhere, so it stands at the mean of the lines: each reads its line
    less V0, and their own V0 is nothing, whatever the board's neutral does. Source: Millman with equal admittances.
    """
    return _against(taps, taps[:, :-1].mean(axis=-1))


def _against(taps: ComplexArray, star: ComplexArray) -> ComplexArray:
    """Taps with the relay's star at ``star`` [states] instead of at the board's neutral."""
    return np.concatenate([taps[:, :-1] - star[:, None], taps[:, -1:] + star[:, None]], axis=-1)


def _sensing(evidence: Evidence, active: tuple[ActiveStage, ...]) -> SensingNeutral | None:
    site, network, relay = evidence.site, evidence.network, evidence.relay
    if all(e.line_to_line_only for e in relay.device.elements):
        return None
    board = network.boards.index(relay.measures_at)
    healthy = tap(network.solve(NONE, connected(site), evidence.levels.nominal), board, relay.earth_reference)
    worst = _worst_tap(evidence, healthy)
    sound, broken = floating_star(healthy), floating_star(worst)
    first, second = relay.supply.between.partition("-")[::2]
    drawn = None
    if second == "N":
        drawn = _against(healthy, healthy[:, site.supply.geometry.names.index(first)])
    return SensingNeutral(
        _volts(sound),
        _v0(evidence, sound),
        _operating(evidence, active, sound),
        _volts(worst),
        _volts(broken),
        _v0(evidence, broken),
        _cleared(evidence, active, loose=True),
        _cleared(evidence, active, loose=False),
        None if drawn is None else _volts(drawn),
        () if drawn is None else _operating(evidence, active, drawn),
    )


def _worst_tap(evidence: Evidence, healthy: ComplexArray) -> ComplexArray:
    """The tap [1, lines + 1] of the state of most volts at nominal supply; the healthy one where nothing is seen."""
    highest, found = 0.0, healthy
    for scenario in evidence.scenarios:
        if scenario.level != NOMINAL or not scenario.resolved.any():
            continue
        volts = np.where(scenario.resolved, scenario.highest_v, 0.0)
        k = int(np.argmax(volts))
        if volts[k] > highest:
            highest, found = float(volts[k]), scenario.taps[k : k + 1]
    return found


def _cleared(evidence: Evidence, active: tuple[ActiveStage, ...], loose: bool) -> Share:
    """Harmful states at nominal supply cleared in time under each load model that harms; unresolved ones are not."""
    nominal = [s for s in evidence.scenarios if s.level == NOMINAL]
    count = of = 0
    for pair in zip(nominal[::2], nominal[1::2], strict=True):
        resolved = pair[0].resolved & pair[1].resolved
        wanted = pair[0].harmful | pair[1].harmful | ~resolved
        done = wanted & resolved
        for scenario in pair:
            done &= ~scenario.harmful | cleared(active, _read(evidence, scenario, loose), evidence)
        count, of = count + int(done.sum()), of + int(wanted.sum())
    return share(count, of)


def _read(evidence: Evidence, scenario: Scenarios, loose: bool) -> Scenarios:
    return as_read(evidence, scenario, floating_star(scenario.taps)) if loose else scenario


def _poles(evidence: Evidence, after: dict[str, Solved]) -> Poles:
    site, network, relay = evidence.site, evidence.network, evidence.relay
    spread_s = site.reference.pole_late_s
    behind = [network.boards.index(b) for b in site.behind(relay.trips)]
    pens = [place for place in after if site.conductor(place) == "PEN"]
    not_modelled = tuple(place for place in pens if not other_users(site, place, relay.trips))
    told = [after[place] for place in pens or after if place not in not_modelled]
    metalwork = [np.abs(solved.pe_earth[behind][:, solved.converged]) for solved in told]
    known = [float(np.nanmax(m)) for m in metalwork if m.size and not np.isnan(m).all()]
    after_pe_v = max(known, default=None)
    alone = evidence.solved.get(relay.trips)
    if alone is None or not alone.converged.any():
        return Poles(relay.poles == "lines and neutral", spread_s, None, None, after_pe_v, not_modelled)
    volts = np.abs(alone.l_n[behind]).max(axis=(0, 1))[alone.converged]
    hurt = int((high_deadline_s(site.equipment, volts) < spread_s).sum())
    early = share(hurt, len(volts))
    return Poles(relay.poles == "lines and neutral", spread_s, float(volts.max()), early, after_pe_v, not_modelled)


def _operating(evidence: Evidence, active: tuple[ActiveStage, ...], taps: ComplexArray) -> tuple[str, ...]:
    """Stages that operate on the first of the taps, the fastest first."""
    seconds = opening_s(evidence, active, taps)[:, 0]
    return tuple(active[k].stage.label for k in np.argsort(seconds, kind="stable") if np.isfinite(seconds[k]))


def _volts(taps: ComplexArray) -> tuple[float, ...]:
    return tuple(float(v) for v in np.abs(taps[0, :-1]))


def _v0(evidence: Evidence, taps: ComplexArray) -> float:
    return float(abs(evidence.site.supply.geometry.displacement(taps[0, :-1])))
