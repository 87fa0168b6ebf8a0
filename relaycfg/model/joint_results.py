"""What a loose joint in the neutral does between sound and open, as plain figures."""

from dataclasses import dataclass

from relaycfg.model.break_results import Share


@dataclass(frozen=True)
class JointPoint:
    """One joint resistance in one load state: volts across it, amperes and watts in it, V0 at the tap, highest L-N.

    ``joint_ohm`` is inf where it is open; ``v0_v`` None without a relay, and in a system without displacement.
    """

    joint_ohm: float
    joint_v: float
    joint_a: float
    joint_w: float
    v0_v: float | None
    highest_l_n_v: float
    resolved: bool


@dataclass(frozen=True)
class JointSight:
    """The least joint that a stage surely picks up on (its least sensitive side), and what it burns by then.

    ``joint_ohm`` is inf where only a joint beyond the sweep is seen, None where none is (``seen`` False). ``before_w``
    is the most watts of any joint below it (of all, where none is seen): what may burn before the stage speaks.
    ``clearing_s`` is the longest time from there to the open switch; None for a stage that gives alarm only.
    """

    stage: str
    seen: bool
    joint_ohm: float | None
    joint_v: float | None
    joint_w: float | None
    before_w: float
    clearing_s: float | None


@dataclass(frozen=True)
class JointState:
    """A sweep in one load state: rising ohms to open, where most heat arises, what each stage sees.

    ``unseen_w`` is the most watts of any joint that no tripping stage picks up on; None without settings.
    """

    name: str
    points: tuple[JointPoint, ...]
    hottest: JointPoint
    sights: tuple[JointSight, ...]
    unseen_w: float | None

    @property
    def unresolved(self) -> int:
        """Resistances of the sweep at which no solution was found."""
        return sum(not p.resolved for p in self.points)


@dataclass(frozen=True)
class JointSweep:
    """One place: the connected state, then the sampled state whose joint can grow hottest.

    ``unseen`` is the share of load states in which no tripping stage picks up on the joint at its hottest, ``heard``
    of those in which the advised alarm would not either; None without settings or where the relay sees no break.
    """

    at: str
    conductor: str
    states: tuple[JointState, ...]
    unseen: Share | None = None
    unheard: Share | None = None


@dataclass(frozen=True)
class EarlyWarning:
    """An alarm stage of the displacement element as advice: nothing is set by it.

    ``pickup_v`` is the lowest settable one that no standing displacement reaches or holds, None where the device has
    no such element or no such setting; ``worth`` whether it speaks before the tripping stages anywhere.
    """

    pickup_v: float | None
    delay_s: float | None
    standing_v: float | None
    standing_case: str
    worth: bool
    sentence: str
