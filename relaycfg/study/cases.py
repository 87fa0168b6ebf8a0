"""Must-hold cases that pass: dips, swells, interruptions, motor starts, short circuits, energising, the user's own."""

from dataclasses import replace

import numpy as np

from relaycfg.model.cases import Case, Course, Segment
from relaycfg.model.geometry import ComplexArray, Geometry, three_phase
from relaycfg.model.site import Fault, Motor, Site, UserCase
from relaycfg.network import FaultKind, Network, connected, motor_start, short_circuit, tap
from relaycfg.study.levels import Healthy, Levels, earth_reference
from relaycfg.study.standing import FOR_EVER, HIGHEST_DISPLACEMENT, standing_cases
from relaycfg.study.third_harmonic import ThirdHarmonic, third_harmonic, with_harmonic

RECOVERY_STEPS = 24
FAULT_KINDS: tuple[FaultKind, ...] = ("L-N", "L-PE", "L-L", "three-phase")
TWO_LINE_FAULTS: tuple[FaultKind, ...] = ("L-N", "L-PE", "L-L", "L-L-N")
STIFF_OHM = 0.001 + 0j
"""Stands for a bolted fault at the terminals of an ideal source, which would have no solution."""


def must_hold_cases(site: Site, network: Network, levels: Levels, healthy: Healthy, board: str) -> tuple[Case, ...]:
    """Every case the relay at ``board`` is played through, numbered from 1 in the order of the printed table."""
    cases = standing_cases(site, healthy, board)
    if site.relay is not None and site.relay.device.detector == "rms":
        cases[-1] = _with_third_harmonic(cases[-1], third_harmonic(site, board))
    cases += [_dip(site, *row) for row in site.reference.dips]
    cases += [_swell(site, *row) for row in site.reference.swells]
    cases.append(_interruption(site))
    cases += [_motor_start(site, network, levels, board, k, m) for k, m in enumerate(site.motors)]
    cases += [_fault(site, levels, board, fault) for fault in site.faults]
    if site.source.kind == "generator":
        cases += _generator_steps(site)
    cases.append(_energising(site))
    cases.append(_lost_reading(site))
    cases += [_user(case) for case in site.user_cases]
    return tuple(replace(case, number=k + 1) for k, case in enumerate(cases))


def sound_tap(site: Site, level_pu: float = 1.0) -> ComplexArray:
    """The tap of a balanced supply at ``level_pu`` of nominal, neutral and PE together."""
    return np.append(site.supply.nominal_v * level_pu * site.supply.geometry.phasors, 0.0)


def _with_third_harmonic(case: Case, harmonic: ThirdHarmonic) -> Case:
    """What an RMS device reads in the courses of highest V0 and highest N-PE."""
    if harmonic.v0_v == 0.0 and harmonic.n_pe_v == 0.0:
        return case
    courses = tuple(
        Course(c.label, tuple(replace(s, tap=with_harmonic(s.tap, harmonic)) for s in c.segments))
        if c.label.startswith(HIGHEST_DISPLACEMENT)
        else c
        for c in case.courses
    )
    at, of = (-1, "N-PE") if harmonic.v0_v == 0.0 else (slice(None, -1), "V0")
    course = next(c for c in courses if c.label.startswith(f"{HIGHEST_DISPLACEMENT} {of}"))
    volts, added = abs(course.segments[0].tap[at].mean()), harmonic.v0_v or harmonic.n_pe_v
    return replace(
        case,
        courses=courses,
        figures=f"{case.figures}; with {added:.1f} V of third harmonic {of} {volts:.1f} V",
    )


def _dip(site: Site, residual_percent: float, duration_s: float, source: str, status: str) -> Case:
    """A dip by its residual voltage: on all lines, one, two, and as seen through a delta-star transformer."""
    shapes = _dip_shapes(site.supply.geometry, residual_percent / 100)
    through = ", and types C, D" if site.supply.geometry.of_star else ""
    lines = "one, two, all lines" if site.supply.geometry.has_sequences else "one line, all lines"
    courses = tuple(_single(label, site.supply.nominal_v * shape, duration_s) for label, shape in shapes.items())
    volts = site.supply.nominal_v * residual_percent / 100
    return Case(
        0,
        f"Dip to {residual_percent:g} %, {duration_s:g} s",
        "hold",
        source,
        status,
        False,
        courses,
        f"{volts:.1f} V for {duration_s:.3g} s on {lines}{through}",
    )


def _dip_shapes(geometry: Geometry, h: float) -> dict[str, ComplexArray]:
    """Line-to-neutral phasors in units of nominal of every kind of dip to ``h``, by name.

    Through a delta-star transformer dips are the types C and D of Bollen's classification (from memory): no zero
    sequence, no swell. Two lines of a star may be any two of its three. A centre-tapped transformer dips both legs;
    a dip of one leg comes from its own network.
    """
    unit = geometry.phasors
    shapes = {"all lines": unit * h, "one line": np.concatenate([unit[:1] * h, unit[1:]])}
    if geometry.has_sequences:
        shapes["two lines"] = np.concatenate([unit[:1], unit[1:] * h])
    if not geometry.of_star:
        return shapes
    star = three_phase("L1-L2-L3" if geometry.angles_deg[1] < 0 else "L1-L3-L2").phasors
    mean = star[1:].mean()
    rotation = star[1:] - mean
    types = {
        "through delta-star, type C": np.concatenate([star[:1], mean + h * rotation]),
        "through delta-star, type D": np.concatenate([star[:1] * h, h * mean + rotation]),
    }
    for name, dipped in types.items():
        if geometry.has_sequences:
            shapes[name] = dipped
            continue
        for first in range(len(star)):
            pair = [first, (first + 1) % len(star)]
            shapes[f"{name}, lines {first + 1} and {pair[1] + 1} of its three"] = dipped[pair] * star[first].conj()
    return shapes


def _swell(site: Site, percent: float, duration_s: float, source: str, status: str) -> Case:
    volts = site.supply.nominal_v * percent / 100
    course = _single("all lines", volts * site.supply.geometry.phasors, duration_s)
    return Case(
        0,
        f"Swell to {volts:.0f} V, {duration_s:g} s",
        "hold",
        source,
        status,
        False,
        (course,),
        f"{volts:.1f} V for {duration_s:.3g} s on all lines",
    )


def _interruption(site: Site) -> Case:
    seconds = site.reference.interruption_s
    course = _single("all lines", np.zeros_like(site.supply.geometry.phasors), seconds)
    return Case(
        0,
        f"Short interruption, {seconds:g} s",
        "hold",
        site.reference.interruption_source,
        site.reference.interruption_status,
        False,
        (course,),
        f"0 V for {seconds:.3g} s",
    )


def _motor_start(site: Site, network: Network, levels: Levels, board: str, index: int, motor: Motor) -> Case:
    at, earth = network.boards.index(board), earth_reference(site)
    courses = []
    for name, emf in (("lower limit", levels.lower), ("upper limit", levels.upper)):
        solved = motor_start(network, site, index, connected(site), emf)
        courses.append(Course(f"supply at its {name}", (Segment(motor.start_s, tap(solved, at, earth)[0]),)))
    lowest = float(np.abs(courses[0].segments[0].tap[:-1]).min())
    return Case(
        0,
        f"Start of {motor.name}",
        "hold",
        f"network; motor at {motor.board}",
        "computed",
        False,
        tuple(courses),
        f"down to {lowest:.1f} V for {motor.start_s:.3g} s at the supply's lower limit",
    )


def _fault(site: Site, levels: Levels, board: str, fault: Fault) -> Case:
    """Every kind at the far and near end and both limits."""
    geometry = site.supply.geometry
    stiff = site.source.line_ohm == 0 and all(site.board(b).cable is None for b in site.path(fault.board))
    ends = {"far": fault.circuit_ohm, "near": 0j}
    if stiff:
        ends = {where: ohm if ohm != 0 else STIFF_OHM for where, ohm in ends.items()}
    pe = short_circuit(site, fault.board, "L-N", ends["far"], levels.upper)[fault.board][-1]
    # Without loads the network is linear, so the lower limit is the upper one scaled.
    lower = abs(levels.lower[0]) / abs(levels.upper[0])
    courses = []
    for where, ohm in ends.items():
        for kind, line, name in _fault_kinds(geometry, not np.isnan(pe)):
            earth = earth_reference(site)
            at_upper = short_circuit(site, fault.board, kind, ohm, levels.upper, earth, line)[board]
            for level, volts in (("upper limit", at_upper), ("lower limit", at_upper * lower)):
                courses.append(Course(f"{name} {where} end, {level}", (Segment(fault.clearing_s, volts),)))
    magnitudes = np.abs(np.stack([c.segments[0].tap[:-1] for c in courses]))
    v0 = max(abs(geometry.displacement(c.segments[0].tap[:-1])) for c in courses)
    shift = f"V0 up to {v0:.1f} V, " if geometry.has_displacement else ""
    return Case(
        0,
        f"Short circuit behind {fault.board}, {fault.clearing_s:g} s",
        "hold",
        fault.source,
        fault.status,
        False,
        tuple(courses),
        f"{magnitudes.min():.1f} to {magnitudes.max():.1f} V, {shift}cleared in {fault.clearing_s:.3g} s",
    )


def _fault_kinds(geometry: Geometry, has_pe: bool) -> list[tuple[FaultKind, int, str]]:
    """Kinds of fault with the index of the line they are on and their name; L-PE only where there is a PE.

    With three lines a fault of the first shows both others; with two, either line is tried.
    """
    found: list[tuple[FaultKind, int, str]] = []
    for kind in FAULT_KINDS if geometry.has_sequences else TWO_LINE_FAULTS:
        if kind == "L-PE" and not has_pe:
            continue
        if geometry.has_sequences or kind not in ("L-N", "L-PE"):
            found.append((kind, 0, kind))
        else:
            found += [(kind, line, kind.replace("L", name, 1)) for line, name in enumerate(geometry.names)]
    return found


def _generator_steps(site: Site) -> list[Case]:
    """Load on and load off: exponential recovery, held at the value that each of its steps begins with."""
    source = site.source
    cases = []
    for name, percent in (("on", source.step_dip_percent), ("off", source.step_rise_percent)):
        start = percent / 100
        constant_s = source.step_recovery_s / np.log(max(abs(percent) / source.step_recovered_percent, np.e))
        edges = np.linspace(0, source.step_recovery_s, RECOVERY_STEPS + 1)
        segments = tuple(
            Segment(float(edges[k + 1] - edges[k]), sound_tap(site, 1 + start * float(np.exp(-edges[k] / constant_s))))
            for k in range(RECOVERY_STEPS)
        )
        peak = site.supply.nominal_v * (1 + start)
        cases.append(
            Case(
                0,
                f"Generator, full load {name}",
                "hold",
                source.step_source,
                source.step_status,
                False,
                (Course("all lines", segments),),
                f"{peak:.1f} V, recovered to {source.step_recovered_percent:g} % in {source.step_recovery_s:.3g} s",
            )
        )
    return cases


def _energising(site: Site) -> Case:
    late = site.supply.nominal_v * site.supply.geometry.phasors
    late[0] = 0
    reference = site.reference
    return Case(
        0,
        "Energising, one pole late",
        "hold",
        reference.pole_late_source,
        reference.pole_late_status,
        False,
        (_single("one pole late", late, reference.pole_late_s),),
        f"{_one_missing(site)} for {reference.pole_late_s:.3g} s, then all lines",
    )


def _lost_reading(site: Site) -> Case:
    missing = sound_tap(site)
    missing[0] = 0
    v0 = abs(site.supply.geometry.displacement(missing[:-1]))
    shown = f", V0 {v0:.1f} V" if site.supply.geometry.has_displacement else ""
    reads = _one_missing(site)
    return Case(
        0,
        "Sensing fuse open, or a line lost upstream",
        "either",
        "own arithmetic",
        "own",
        False,
        (Course(reads, (Segment(FOR_EVER, missing),)),),
        f"{reads} for ever{shown}; not a lost neutral, line-to-line volts tell",
    )


def _one_missing(site: Site) -> str:
    """Line-to-neutral volts without the first line, such as 0 / U / U."""
    return " / ".join(["0", *("U" for _ in site.supply.geometry.names[1:])])


def _single(label: str, l_n: ComplexArray, duration_s: float) -> Course:
    return Course(label, (Segment(duration_s, np.append(l_n, 0.0)),))


def _user(case: UserCase) -> Case:
    segments = tuple(Segment(s.duration_s, np.append(np.array(s.l_n_v), np.nan)) for s in case.segments)
    parts = (" / ".join(f"{abs(v):.1f}" for v in s.l_n_v) + f" V {s.duration_s:.3g} s" for s in case.segments)
    return Case(
        0, case.name, case.expect, case.source, "user", False, (Course("as given", segments),), "; ".join(parts)
    )
