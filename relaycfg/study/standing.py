"""Standing cases: what a sound supply may show at the tap for ever, at its limits and at its most unbalanced."""

import numpy as np

from relaycfg.model.cases import Case, Course, Segment
from relaycfg.model.geometry import ComplexArray, Geometry
from relaycfg.model.site import Site
from relaycfg.relay import measured_quantities
from relaycfg.study.levels import Healthy

FOR_EVER = float("inf")
ANGLE_STEPS = 24
UNBALANCED_STATES = 16


def standing_cases(site: Site, healthy: Healthy, board: str) -> list[Case]:
    """The cases that last for ever, numbers still 0: upper limit, lower limit, no-load volts, unbalance."""
    geometry = site.supply.geometry
    supply = site.supply
    upper, lower = _l_n(healthy.upper), _l_n(healthy.lower)
    high = int(np.argmax(np.abs(upper).max(axis=-1)))
    low = int(np.argmin(np.abs(lower).min(axis=-1)))
    free = int(np.argmax(np.abs(_l_n(healthy.no_load)).max(axis=-1)))
    most = float(np.abs(upper[high]).max())
    band = f"{supply.band_name}: {supply.band_source}"
    return [
        _standing(
            "Supply at its upper limit",
            band,
            (_course(f"state {healthy.names[high]}", healthy.upper[high]),),
            f"{_volts(upper[high])} at {board}, {supply.high_v:.1f} V promised at {supply.band_at}",
        ),
        _standing(
            "Supply at its lower limit",
            band,
            (_course(f"state {healthy.names[low]}", healthy.lower[low]),),
            f"{_volts(lower[low])} at {board}, {supply.low_v:.1f} V promised at {supply.band_at}",
        ),
        _standing(
            "Source at its no-load volts",
            f"source.no_load_v {site.source.emf_v:.1f} V",
            (_course(f"state {healthy.names[free]}", healthy.no_load[free]),),
            f"{_volts(_l_n(healthy.no_load)[free])} at {board}",
        ),
        _standing(
            "Most unbalanced healthy state",
            f"network; supply V2/V1 {supply.unbalance_percent:g} %, displacement {supply.displacement_percent:g} %",
            _unbalanced(site, healthy, most),
            _unbalance_figures(geometry, _unbalanced(site, healthy, most)),
        ),
    ]


def third_harmonic_v0(site: Site, board: str) -> float:
    """Standing RMS of third-harmonic V0 at ``board`` with every load connected [V].

    Each load's third harmonic is taken in phase on all lines, so it returns through the neutral threefold:
    V0 = I3 (Z_L + 3 Z_N) along the path, reactances at three times the frequency. Source: own arithmetic.
    """
    lines = len(site.supply.geometry.names)

    def at_third(z: complex) -> complex:
        return complex(z.real, 3 * z.imag)

    def per_line(boards: tuple[str, ...]) -> float:
        amperes = 0.0
        for load in site.loads:
            if load.board in boards and load.to_neutral:
                rated = abs(complex(load.p_w, load.q_var)) / site.supply.nominal_v
                amperes += rated * load.third_harmonic_percent / 100
        return amperes / lines

    everywhere = tuple(b.name for b in site.boards)
    drop = per_line(everywhere) * (at_third(site.source.line_ohm) + 3 * at_third(site.source.neutral_ohm))
    for name in site.path(board):
        cable = site.board(name).cable
        if cable is not None:
            drop += per_line(site.behind(name)) * (at_third(cable.line_ohm) + 3 * at_third(cable.neutral_ohm))
    return float(abs(drop))


def _unbalanced(site: Site, healthy: Healthy, most_v: float) -> tuple[Course, ...]:
    geometry = site.supply.geometry
    v0 = np.abs(_l_n(healthy.upper).mean(axis=-1))
    state = int(np.argmax(v0))
    moved = _displaced(site, healthy.upper[state])
    courses = [_course(f"highest V0, state {healthy.names[state]}", _within(moved, most_v))]
    # The worst angle of V2 depends on the state, so the most displaced states are tried at every angle.
    candidates = np.argsort(v0)[::-1][:UNBALANCED_STATES]
    turns = np.exp(2j * np.pi * np.arange(ANGLE_STEPS) / ANGLE_STEPS)
    v2 = site.supply.unbalance_percent / 100 * site.supply.nominal_v * turns
    negative = np.zeros((ANGLE_STEPS, len(geometry.names) + 1), complex)
    negative[:, :-1] = v2[:, None] * geometry.phasors.conj()
    for name in ("line-to-neutral deviation", "line-to-line deviation", "V2/V1", "spread"):
        taps = np.stack([_displaced(site, healthy.upper[k]) for k in candidates])[:, None, :] + negative[None]
        figures = measured_quantities(geometry, taps)["unbalance_percent"][name]
        k, angle = np.unravel_index(int(np.argmax(figures)), figures.shape)
        label = f"highest {name}, state {healthy.names[candidates[k]]}"
        courses.append(_course(label, _within(taps[k, angle], most_v)))
    return tuple(courses)


def _displaced(site: Site, tap: ComplexArray) -> ComplexArray:
    """The tap with the supply's own displacement added where it makes V0 largest."""
    lines = len(site.supply.geometry.names)
    v0 = tap[:lines].mean()
    direction = v0 / abs(v0) if abs(v0) > 0 else 1.0
    moved = tap.copy()
    moved[:lines] += direction * site.supply.displacement_percent / 100 * site.supply.nominal_v
    return moved


def with_harmonic(tap: ComplexArray, harmonic_v0: float) -> ComplexArray:
    """The tap whose |V0| is the root sum of squares of its own and ``harmonic_v0`` (what an RMS device reads)."""
    v0 = tap[..., :-1].mean()
    direction = v0 / abs(v0) if abs(v0) > 0 else 1.0
    moved = tap.copy()
    moved[..., :-1] += direction * (np.hypot(abs(v0), harmonic_v0) - abs(v0))
    return moved


def _within(tap: ComplexArray, most_v: float) -> ComplexArray:
    """Shrink all but the zero sequence until no line exceeds ``most_v``: unbalance lies inside the band."""
    lines = tap[:-1]
    if np.abs(lines).max() <= most_v:
        return tap
    v0 = lines.mean()
    low, high = 0.0, 1.0
    for _ in range(50):
        middle = (low + high) / 2
        if np.abs(v0 + middle * (lines - v0)).max() <= most_v:
            low = middle
        else:
            high = middle
    return np.append(v0 + low * (lines - v0), tap[-1])


def _standing(name: str, source: str, courses: tuple[Course, ...], figures: str) -> Case:
    return Case(0, name, "hold", source, "computed", True, courses, figures)


def _course(label: str, tap: ComplexArray) -> Course:
    return Course(label, (Segment(FOR_EVER, tap),))


def _l_n(taps: ComplexArray) -> ComplexArray:
    return taps[..., :-1]


def _volts(l_n: ComplexArray) -> str:
    return " / ".join(f"{v:.1f}" for v in np.abs(l_n)) + " V"


def _unbalance_figures(geometry: Geometry, courses: tuple[Course, ...]) -> str:
    quantities = [measured_quantities(geometry, c.segments[0].tap[None]) for c in courses]

    def most(name: str) -> float:
        return max(float(np.max(q["unbalance_percent"][name])) for q in quantities)

    v0 = max(float(np.max(q["v0_v"])) for q in quantities)
    return (
        f"V0 up to {v0:.1f} V; line-to-neutral deviation {most('line-to-neutral deviation'):.1f} %, "
        f"line-to-line {most('line-to-line deviation'):.1f} %, V2/V1 {most('V2/V1'):.1f} %"
    )
