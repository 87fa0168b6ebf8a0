"""Standing cases: what a sound supply may show at the tap for ever, at its limits and at its most unbalanced."""

import numpy as np

from relaycfg.model.cases import Case, Course, Segment
from relaycfg.model.geometry import ComplexArray, FloatArray, Geometry
from relaycfg.model.site import Site
from relaycfg.relay import definitions, measured_quantities
from relaycfg.study.levels import Healthy, earth_reference

FOR_EVER = float("inf")
ANGLE_STEPS = 24
UNBALANCED_STATES = 16
"""States of highest V0 in which the supply's unbalance is tried at every angle."""
HIGHEST_DISPLACEMENT = "most displaced by"
TINY_V = 1e-12
LARGEST_SCALE = 2.0
BISECTIONS = 50


def standing_cases(site: Site, healthy: Healthy, board: str) -> list[Case]:
    """The cases that last for ever, numbers still 0: upper limit, lower limit, no-load volts, unbalance."""
    geometry = site.supply.geometry
    supply = site.supply
    upper, lower = _l_n(healthy.upper), _l_n(healthy.lower)
    high = int(np.argmax(np.abs(upper).max(axis=-1)))
    low = int(np.argmin(np.abs(lower).min(axis=-1)))
    free = int(np.argmax(np.abs(_l_n(healthy.no_load)).max(axis=-1)))
    least, most = float(np.abs(lower[low]).min()), float(np.abs(upper[high]).max())
    band, known = f"{supply.band_name}: {supply.band_source}", _known(supply.band_status)
    unbalanced = _unbalanced(site, healthy, least, most)
    sides = [f"V2/V1 {supply.unbalance_percent:g} %"] if geometry.of_star else []
    sides.append(f"displacement {supply.displacement_percent:g} %")
    return [
        _standing(
            "Supply at its upper limit",
            band,
            (_course(f"state {healthy.names[high]}", healthy.upper[high]),),
            f"{_volts(upper[high])} at {board}, {supply.high_v:.1f} V promised at {supply.band_at}",
            known,
        ),
        _standing(
            "Supply at its lower limit",
            band,
            (_course(f"state {healthy.names[low]}", healthy.lower[low]),),
            f"{_volts(lower[low])} at {board}, {supply.low_v:.1f} V promised at {supply.band_at}",
            known,
        ),
        _standing(
            "Source at its no-load volts",
            f"source.no_load_v {site.source.emf_v:.1f} V",
            (_course(f"state {healthy.names[free]}", healthy.no_load[free]),),
            f"{_volts(_l_n(healthy.no_load)[free])} at {board}",
        ),
        _standing(
            "Most unbalanced healthy state",
            f"network; supply {', '.join(sides)}",
            unbalanced,
            _unbalance_figures(geometry, unbalanced),
        ),
    ]


def _unbalanced(site: Site, healthy: Healthy, least_v: float, most_v: float) -> tuple[Course, ...]:
    """Courses of highest displacement (V0, and N against PE) and of highest unbalance by each definition.

    The supply's V2 is taken of each state's own V1 and tried at every angle, since the worst one depends on the state.
    Where the system has no V0, the states that deviate most from line to neutral stand for those of highest V0.
    """
    geometry = site.supply.geometry
    names = healthy.names * 2
    taps = _displaced(site, np.concatenate([healthy.upper, healthy.lower]))
    uneven = _unevenness(geometry, taps)
    ranked = {"V0": uneven} if geometry.has_displacement else {}
    ranked["N-PE"] = np.nan_to_num(np.abs(taps[:, -1]))
    courses = [
        _course(f"{HIGHEST_DISPLACEMENT} {what}, state {names[k]}", _within(geometry, taps[k], least_v, most_v))
        for what, k in ((what, int(np.argmax(volts))) for what, volts in ranked.items())
    ]
    candidates = np.argsort(uneven)[::-1][:UNBALANCED_STATES]
    turns = np.exp(2j * np.pi * np.arange(ANGLE_STEPS) / ANGLE_STEPS)
    _, v1, _ = geometry.sequences(_l_n(taps[candidates]))
    negative = np.zeros((len(candidates), ANGLE_STEPS, len(geometry.names) + 1), complex)
    size = site.supply.unbalance_percent / 100 * np.abs(v1)
    negative[..., :-1] = size[:, None, None] * turns[:, None] * geometry.phasors.conj()
    tried = taps[candidates][:, None, :] + negative
    unbalance = measured_quantities(geometry, tried)["unbalance_percent"]
    for name, figures in ((name, unbalance[name]) for name in definitions(geometry)):
        k, angle = np.unravel_index(int(np.argmax(figures)), figures.shape)
        label = f"highest {name}, state {names[candidates[k]]}"
        courses.append(_course(label, _within(geometry, tried[k, angle], least_v, most_v)))
    return tuple(courses)


def _unevenness(geometry: Geometry, taps: ComplexArray) -> FloatArray:
    """What the taps are ranked by: their V0, or without one their deviation from line to neutral."""
    measured = measured_quantities(geometry, taps)
    figures: FloatArray = measured["unbalance_percent"]["line-to-neutral deviation"]
    return measured["v0_v"] if geometry.has_displacement else figures


def _displaced(site: Site, taps: ComplexArray) -> ComplexArray:
    """The taps [states, lines + 1] with the supply's own displacement added where it makes V0 largest.

    Without a V0 it is added along the line from the lower to the higher of two lines, which parts them most.
    It moves N against the earth of the tap only where that is an electrode of its own (TT, or the relay's choice).
    """
    geometry = site.supply.geometry
    if geometry.has_displacement:
        along = geometry.displacement(_l_n(taps))[..., np.newaxis]
    else:
        volts = np.abs(_l_n(taps))
        along = ((volts[:, :1] - volts[:, -1:]) * (geometry.phasors[0] - geometry.phasors[-1])).astype(complex)
    added = _direction(along) * site.supply.displacement_percent / 100 * site.supply.nominal_v
    moved = taps.copy()
    moved[:, :-1] += added
    if site.supply.earthing == "TT" or earth_reference(site) == "own electrode":
        n_pe = moved[:, -1:]
        moved[:, -1:] += np.abs(added) * _direction(n_pe)
    return moved


def _direction(phasors: ComplexArray) -> ComplexArray:
    """Unit phasors along the given ones; along the reference where there is nothing but rounding."""
    size = np.abs(phasors)
    there = size > TINY_V
    return np.where(there, phasors / np.where(there, size, 1.0), 1.0)


def _within(geometry: Geometry, tap: ComplexArray, least_v: float, most_v: float) -> ComplexArray:
    """All but the zero sequence scaled until every line lies between the standing extremes, as far as both allow.

    Without a zero sequence everything is scaled.
    Unbalance lies inside the band, not on top of it: a line pulled below the lower limit means a higher supply.
    """
    lines = tap[:-1]
    v0 = complex(geometry.displacement(lines)) if geometry.has_displacement else 0j

    def spread(scale: float) -> tuple[float, float]:
        volts = np.abs(v0 + scale * (lines - v0))
        return float(volts.min()), float(volts.max())

    low, high = 0.0, LARGEST_SCALE
    for _ in range(BISECTIONS):
        middle = (low + high) / 2
        least, most = spread(middle)
        low, high = (middle, high) if least < least_v and most <= most_v else (low, middle)
    raised = max(1.0, low)
    if spread(raised)[1] <= most_v:
        return np.append(v0 + raised * (lines - v0), tap[-1])
    low, high = 0.0, 1.0
    for _ in range(BISECTIONS):
        middle = (low + high) / 2
        low, high = (middle, high) if spread(middle)[1] <= most_v else (low, middle)
    return np.append(v0 + low * (lines - v0), tap[-1])


def _known(status: str) -> str:
    """Volts at the board are computed; from a limit that is only remembered they are no better than it."""
    return "memory" if status == "memory" else "computed"


def _standing(name: str, source: str, courses: tuple[Course, ...], figures: str, status: str = "computed") -> Case:
    return Case(0, name, "hold", source, status, True, courses, figures)


def _course(label: str, tap: ComplexArray) -> Course:
    return Course(label, (Segment(FOR_EVER, tap),))


def _l_n(taps: ComplexArray) -> ComplexArray:
    return taps[..., :-1]


def _volts(l_n: ComplexArray) -> str:
    return " / ".join(f"{v:.1f}" for v in np.abs(l_n)) + " V"


def _unbalance_figures(geometry: Geometry, courses: tuple[Course, ...]) -> str:
    quantities = [measured_quantities(geometry, c.segments[0].tap[None]) for c in courses]
    short = {"line-to-neutral deviation": "line-to-neutral deviation", "line-to-line deviation": "line-to-line"}

    def most(name: str) -> float:
        return max(float(np.max(q["unbalance_percent"][name])) for q in quantities)

    shown = ", ".join(f"{short.get(n, n)} {most(n):.1f} %" for n in definitions(geometry) if n != "spread")
    if not geometry.has_displacement:
        return shown
    v0 = max(float(np.max(q["v0_v"])) for q in quantities)
    return f"V0 up to {v0:.1f} V; {shown}"
