"""What is no lost neutral: other faults at the relay's terminals, and how surely readings tell them apart."""

from dataclasses import dataclass
from typing import Literal

from relaycfg.model.break_results import Share

Truth = Literal["lost neutral", "other", "own wire"]
"""What a pattern is: ``own wire`` is the relay's own neutral loose, on a sound board or a lost neutral."""
KINDS = ("lost neutral", "line", "fuse or lead", "supply", "sound or balanced", "other")
"""What a reading may name first."""


@dataclass(frozen=True)
class Opening:
    """A stage that operates, and the longest time until the switch is open [s]."""

    stage: str
    seconds: float


@dataclass(frozen=True)
class Companion:
    """One pattern at the relay's terminals in one load state, what it makes the relay do and how it is read."""

    name: str
    kind: Truth
    l_n_v: tuple[float, ...]
    l_l_v: tuple[float, ...]
    v0_v: float
    operates: tuple[Opening, ...]
    """Stages that operate while it lasts, the fastest first; none while a feed keeps the relay from it."""
    unfed: str
    """Supply or coil out of its range in this state, with its volts; empty where both are fed."""
    unfed_share: Share
    """Load states of the pattern in which supply or coil is out of its range."""
    displaced: bool
    """Whether an active 59N operates, here or, where the relay is unfed, in the median state in which it is fed."""
    read_alone: str
    """First cause that readings line to neutral name."""
    read_with_lines: str
    """The same with the volts between lines read on the supply side."""
    message: str
    """What the operator should be told."""


@dataclass(frozen=True)
class Confusion:
    """How readings of many load states of one truth are named first; the counts add up to ``of``."""

    truth: str
    kind: Truth
    with_lines: bool
    of: int
    unresolved: int
    """Load states without a solution, in none of the counts."""
    named: dict[str, int]
    named_neutral: Share


@dataclass(frozen=True)
class Companions:
    """All patterns beside a lost neutral, and the table of confusion."""

    patterns: tuple[Companion, ...]
    confusion: tuple[Confusion, ...]

    def named_neutral(self, kind: Truth, with_lines: bool) -> tuple[Share, str]:
        """The share named a lost neutral first, and of which truth: of lost neutrals the least, else the largest."""
        rows = [c for c in self.confusion if c.kind == kind and c.with_lines is with_lines]
        if not rows:
            return Share(0, 0, 0.0, 1.0), ""
        sign = -1 if kind == "lost neutral" else 1
        row = max(rows, key=lambda c: sign * c.named_neutral.percent)
        return row.named_neutral, row.truth
