"""Loose joints as terminal text: what burns unseen first, then where the stages speak, and the advice on an alarm."""

from collections.abc import Sequence

from relaycfg import units
from relaycfg.model.joint_results import JointSight, JointState, JointSweep
from relaycfg.model.results import Study
from relaycfg.text.figures import place, share
from relaycfg.text.layout import heading, table, wrapped

EVERY = 3
"""Of the sweep's joints, those listed: two to the decade."""


def hottest_joints(sweeps: Sequence[JointSweep], most: int) -> list[str]:
    """Without settings: the hottest joint of each place, in the load state in which it grows hottest."""
    if not sweeps:
        return []
    heads = ["Place", "Load state", "Most W", "at ohm", "V across", "A", "V0", "Highest L-N"]
    rows = []
    for sweep in sweeps[:most]:
        state = sweep.states[-1]
        h = state.hottest
        figures = [units.watts(h.joint_w), units.ohms(h.joint_ohm), units.volts(h.joint_v), units.amperes(h.joint_a)]
        rows.append([place(sweep.at), state.name, *figures, units.volts(h.v0_v), units.volts(h.highest_l_n_v)])
    lines = heading("A loose joint instead of the open neutral, where it burns most")
    return [*lines, *table(heads, rows, 2, among=[s.at for s in sweeps])]


def every_joint(sweeps: Sequence[JointSweep]) -> list[str]:
    """The sweep of every place and state, from a milliohm to open."""
    lines: list[str] = []
    heads = ["Ohm", "V across", "A", "W", "V0", "Highest L-N"]
    for sweep in sweeps:
        for state in sweep.states:
            rows = [
                [
                    units.ohms(p.joint_ohm) if p.joint_ohm < float("inf") else "open",
                    *(f"{figure}{'' if p.resolved else ' ?'}" for figure in (units.volts(p.joint_v),)),
                    units.amperes(p.joint_a),
                    units.watts(p.joint_w),
                    units.volts(p.v0_v),
                    units.volts(p.highest_l_n_v),
                ]
                for p in (*state.points[:-1:EVERY], state.points[-1])
            ]
            lines += heading(f"{place(sweep.at)}, joint from a milliohm to open, state {state.name}")
            lines += table(heads, rows, 0)
            lines += ["? no solution found there"] if state.unresolved else []
    return lines


def loose_joints(study: Study) -> list[str]:
    """With settings: watts no stage picks up on, the first stage that does, the hottest joint; shares; the advice."""
    seen = [s for s in study.breaks.joints if s.unseen is not None]
    if not seen:
        return []
    heads = [
        "Place",
        "Load state",
        "W, no pickup",
        "First to trip",
        "at ohm",
        "W by then",
        "Most W",
        "at ohm",
        "V across",
    ]
    rows = [_row(sweep, state) for sweep in seen for state in sweep.states]
    lines = [*heading("Loose joint in the neutral"), *table(heads, rows, 2)]
    limit = study.site.judgement.hot_joint_w
    shares = "; ".join(f"{place(s.at)} {share(s.unseen)}" for s in seen if s.unseen is not None)
    many = units.count(seen[0].unseen.of) if seen[0].unseen is not None else ""
    lines += wrapped(
        "W, no pickup: most W of any joint on which no tripping stage picks up. "
        f"Of the first {many} load states, those with a joint of {units.watts(limit)} W or more that no stage sees: "
        f"{shares}"
    )
    return [*lines, *(wrapped(study.early_warning.sentence) if study.early_warning else [])]


def _row(sweep: JointSweep, state: JointState) -> list[str]:
    first, hot = first_trip(state), state.hottest
    spoken = ["none", units.ABSENT, units.ABSENT]
    if first is not None:
        spoken = [first.stage, joint_ohms(first), units.watts(first.before_w)]
    figures = [units.watts(hot.joint_w), units.ohms(hot.joint_ohm), units.volts(hot.joint_v)]
    return [place(sweep.at), state.name, units.watts(state.unseen_w), *spoken, *figures]


def first_trip(state: JointState) -> JointSight | None:
    """The tripping stage that picks up at the least ohms; None where none does."""
    trips = [s for s in state.sights if s.clearing_s is not None and s.joint_ohm is not None]
    return min(trips, key=lambda s: s.joint_ohm or 0.0, default=None)


def joint_ohms(sight: JointSight) -> str:
    """The ohms a stage first sees; beyond the sweep it takes an open neutral."""
    if sight.joint_ohm is None:
        return "never"
    return units.ohms(sight.joint_ohm) if sight.joint_ohm < float("inf") else "open"
