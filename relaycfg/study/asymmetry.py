"""The smallest load asymmetry each element sees behind a stiff source, and one break worked by hand."""

import numpy as np

from relaycfg.model.geometry import BoolArray, ComplexArray
from relaycfg.model.results import WorkedBreak
from relaycfg.model.site import SOURCE, Load, Motor, Site
from relaycfg.network import connected
from relaycfg.relay import severities
from relaycfg.study.evidence import Evidence
from relaycfg.study.scenarios import seen_places
from relaycfg.study.stages import ActiveStage

LARGEST_RATIO = 100.0
RATIO_STEPS = 20001
STILL_V = 0.001


def smallest_asymmetry(evidence: Evidence, stages: tuple[ActiveStage, ...]) -> dict[str, float | None]:
    """Smallest k of resistive loads k:1:1 that a set of elements sees at nominal supply, open neutral; None: never.

    Closed form for a stiff source (Millman); what stays below k is not detectable at these settings.
    """
    ratios = np.geomspace(1.0, LARGEST_RATIO, RATIO_STEPS)
    taps = _open_star(evidence, ratios)
    found: dict[str, float | None] = {}
    for name, chosen in element_sets(stages).items():
        seen = picks_up(evidence, chosen, taps)
        found[name] = float(ratios[np.argmax(seen)]) if seen.any() else None
    return found


def element_sets(stages: tuple[ActiveStage, ...]) -> dict[str, tuple[ActiveStage, ...]]:
    """The stages of each element that has any, by its name, and all of them together where there are several."""
    sets = {f.value: tuple(s for s in stages if s.function is f) for f in dict.fromkeys(s.function for s in stages)}
    return sets | ({"all": stages} if len(sets) > 1 else {})


def picks_up(evidence: Evidence, stages: tuple[ActiveStage, ...], taps: ComplexArray) -> BoolArray:
    """Whether some stage surely picks up at those taps [..., lines + 1], at the least sensitive end of its band."""
    seen = np.zeros(taps.shape[:-1], bool)
    for stage in stages:
        channels = severities(
            stage.ladder.element, evidence.site.supply.geometry, taps, evidence.relay.device.displacement_from
        )
        worst = channels.min(axis=-1) if stage.stage.phases == "all" else channels.max(axis=-1)
        seen |= worst >= stage.insensitive.pickup
    return seen


def _open_star(evidence: Evidence, ratios: np.ndarray) -> ComplexArray:
    """Taps [ratios, lines + 1] of a star with the first line's conductance k times the others', neutral open."""
    geometry = evidence.site.supply.geometry
    emf = evidence.site.supply.nominal_v * geometry.phasors
    conductance = np.ones((len(ratios), len(emf)))
    conductance[:, 0] = ratios
    shift = (conductance * emf).sum(axis=1) / conductance.sum(axis=1)
    l_n = emf - shift[:, None]
    return np.concatenate([l_n, np.zeros((len(ratios), 1)) if _tied(evidence) else shift[:, None]], axis=1)


def _tied(evidence: Evidence) -> bool:
    """Whether PE moves with N at the relay in every break it could see: N against PE then stays near 0."""
    relay = evidence.relay
    n_pe = [np.abs(s.taps[:, -1]) for s in evidence.scenarios if s.place in seen_places(evidence.site, relay)]
    return all(float(np.nan_to_num(volts).max(initial=0.0)) < STILL_V for volts in n_pe)


def worked_break(evidence: Evidence) -> WorkedBreak | None:
    """The break nearest to the relay with every load connected, by Millman's theorem, beside the solver's volts.

    Cables and source are left out, which is the difference to the solver. None where nothing ties the neutral.
    """
    site, network = evidence.site, evidence.network
    place = seen_places(site, evidence.relay)[-1]
    geometry = site.supply.geometry
    behind = site.behind(place)
    admittance = np.zeros(len(geometry.names), complex)
    items: tuple[Load | Motor, ...] = (*site.loads, *site.motors)
    for item in items:
        if item.board in behind and item.to_neutral:
            power = item.running_va if isinstance(item, Motor) else complex(item.p_w, item.q_var)
            admittance[list(item.lines)] += power.conjugate() / len(item.lines) / site.supply.nominal_v**2
    path = electrode_path_s(site, place)
    if abs(admittance.sum() + path) == 0:
        return None
    emf = evidence.levels.nominal
    shift = complex((emf * admittance).sum() / (admittance.sum() + path))
    solved = network.solve(place, connected(site), emf, all_impedance=True)
    return WorkedBreak(
        place,
        "connected",
        tuple(complex(y) for y in admittance),
        complex(path),
        float(abs(emf[0])),
        shift,
        tuple(float(v) for v in np.abs(emf - shift)),
        tuple(float(v) for v in np.abs(solved.l_n[network.boards.index(behind[0]), :, 0])),
    )


def electrode_path_s(site: Site, place: str) -> float:
    """Admittance of the way back through electrodes tied to N behind the break, and the source's electrode.

    None at the star link where the source's electrode sits on the bar: it is behind that break itself.
    """
    if place == SOURCE and site.source.earth_at == "neutral-bar":
        return 0.0
    tied = [b.electrode_ohm for b in map(site.board, site.behind(place)) if b.neutral_earth_link and b.electrode_ohm]
    if not tied or site.source.electrode_ohm is None:
        return 0.0
    return 1 / (site.source.electrode_ohm + 1 / sum(1 / ohm for ohm in tied))
