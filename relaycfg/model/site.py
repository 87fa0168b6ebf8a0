"""A resolved site: SI units, defaults filled in, names checked. Made by ``files``, read by everything else."""

from dataclasses import dataclass, field, replace
from typing import Literal

from relaycfg.model.device import Device
from relaycfg.model.geometry import Geometry
from relaycfg.model.judgement import Judgement

Tag = Literal["measured", "nameplate", "letter", "assumed", "default"]
EarthReference = Literal["local PE", "own electrode"]
SOURCE = "source"
"""Reserved place name: the star point, and as a break place the star link."""
NONE = "none"
"""Reserved place name: no break, the healthy network."""


@dataclass(frozen=True)
class Input:
    """One input as printed on the sheet: where it stands, what it is and how well it is known."""

    field: str
    value: str
    unit: str
    tag: Tag
    note: str
    status: str = ""
    """Status of the table row behind a default (read, quoted, memory, own); empty for the user's own figures."""


@dataclass(frozen=True)
class Person:
    """Name and role of one who signs; empty strings are blank lines on the sheet."""

    name: str = ""
    role: str = ""


@dataclass(frozen=True)
class Document:
    """Identity of the setting sheet, printed as stated by the user."""

    title: str
    number: str
    revision: str
    status: str
    date: str
    site: str
    paper: Literal["A4", "Letter"]
    fault_contact: str
    prepared: Person = Person()
    checked: Person = Person()
    approved: Person = Person()
    accepted: Person = Person()


@dataclass(frozen=True)
class Supply:
    """What the supply promises: band, unbalance and standing displacement at ``band_at``."""

    geometry: Geometry
    nominal_v: float
    frequency_hz: float
    earthing: Literal["TN-C-S", "TN-S", "TT"]
    low_v: float
    high_v: float
    band_name: str
    band_source: str
    band_status: str
    band_at: str
    unbalance_percent: float
    displacement_percent: float


@dataclass(frozen=True)
class Source:
    """EMF behind impedance between the star point and the source's line terminals, all ohms at low voltage.

    ``neutral_ohm`` stands between the star of the EMFs and the star point: (Z0 - Z1) / 3 of a transformer
    (small and possibly negative) or the neutral impedance of a plain-ohm source.
    """

    name: str
    kind: Literal["transformer", "generator", "impedance"]
    emf_v: float
    line_ohm: complex
    neutral_ohm: complex
    star_link_ohm: float
    electrode_ohm: float | None
    earth_at: Literal["neutral-bar", "star-point"]
    step_dip_percent: float = 0.0
    """Generator: first dip on a load step (negative) and rise on load off, with recovery; zero elsewhere."""
    step_rise_percent: float = 0.0
    step_recovery_s: float = 0.0
    step_recovered_percent: float = 0.0
    """Deviation from nominal at which it counts as recovered."""
    step_source: str = ""
    step_status: str = ""


@dataclass(frozen=True)
class Cable:
    """Series ohms of each conductor of a feed at load temperature, and at 20 C for short circuits."""

    line_ohm: complex
    neutral_ohm: complex
    pe_ohm: complex | None
    fault_line_ohm: complex
    fault_neutral_ohm: complex
    fault_pe_ohm: complex | None


@dataclass(frozen=True)
class Board:
    """A distribution board; without a cable it is the same node as what feeds it."""

    name: str
    fed_from: str
    cable: Cable | None
    neutral_earth_link: bool
    electrode_ohm: float | None
    touch_limit_v: float = float("inf")
    """Touch voltage that may stay at what it feeds [V]."""


@dataclass(frozen=True)
class Load:
    """One load (``count`` merged in). Power at its own nominal voltage; generation is negative.

    Between the band edges current follows the ZIP polynomials of P and Q, outside them the constant impedance
    that continues the edge. ``lines`` are line indices; ``to_neutral`` tells a star tied to N (or a single L-N
    load) from a load between lines.
    """

    name: str
    board: str
    between: str
    lines: tuple[int, ...]
    to_neutral: bool
    p_w: float
    q_var: float
    zip_p: tuple[float, float, float]
    zip_q: tuple[float, float, float]
    band_low_pu: float
    band_high_pu: float
    usage: float
    demand: float
    group: str
    minds_low_v: bool
    third_harmonic_percent: float
    kind: str
    cutout_pu: float | None = None
    """Below these volts it drops out (None: it never does)."""
    restart_s: float | None = None
    """So long after its volts are back at ``band_low_pu`` it starts again (None: it stays out)."""
    stall_pu: float | None = None
    """Single-phase motor inside: below these volts it stalls and takes ``stalled_va`` (at nominal volts) instead."""
    stalled_va: complex = 0j
    damage_pu: float | None = None
    """At these volts it fails open (None: it stands whatever comes)."""


@dataclass(frozen=True)
class Motor:
    """A motor as linear admittances; apparent powers [VA], complex P + jQ, at nominal voltage, whole motor.

    Three-wire motors have no path for zero sequence. Running, the negative sequence meets the locked-rotor
    admittance (usual approximation: slip 2 - s is near that of standstill).
    """

    name: str
    board: str
    between: str
    lines: tuple[int, ...]
    to_neutral: bool
    shaft_w: float
    running_va: complex
    starting_va: complex
    start_s: float
    usage: float
    stall_pu: float | None = None
    """Below these volts a single-phase motor stalls and takes ``starting_va``."""


@dataclass(frozen=True)
class Fault:
    """A short circuit behind a board; ``circuit_ohm`` one way, line and neutral each, 0 for a bolted one."""

    board: str
    circuit_ohm: complex
    clearing_s: float
    assumed: bool
    source: str
    status: str


@dataclass(frozen=True)
class Feed:
    """What an auxiliary circuit lives on: ``auxiliary``, a line-to-neutral or a line-to-line pair.

    The range is None where it is not stated.
    """

    between: str
    low_v: float | None
    high_v: float | None


@dataclass(frozen=True)
class Relay:
    """A relay on the site: where it measures, which board's incoming switch it opens, how fast."""

    name: str
    measures_at: str
    trips: str
    poles: Literal["lines and neutral", "lines"]
    device: Device
    supply: Feed
    trip_coil_kind: Literal["shunt", "undervoltage release", "contactor"]
    trip_coil: Feed
    output_s: float
    coil_and_breaker_s: float
    dead_bus_pu: float = 0.0
    """Share of nominal below which all line-to-neutral volts together count as a dead system; 0: it never does."""
    earth_reference: EarthReference = "local PE"
    """Earth that N is measured against where the device takes displacement from N to earth."""


@dataclass(frozen=True)
class Equipment:
    """Line-to-neutral RMS that connected equipment stands: [volts, seconds] steps, rising volts on the high side.

    High: none up to ``sustained_high_v``; between it and the first point ``sustained_high_s``; at or above a
    point, cleared within its seconds. Low: none down to ``sustained_low_v`` (None: nobody minds), then
    ``sustained_low_s``; ``low_points`` fall in volts.
    """

    sustained_high_v: float
    sustained_high_s: float
    high_points: tuple[tuple[float, float], ...]
    sustained_low_v: float | None
    sustained_low_s: float
    low_points: tuple[tuple[float, float], ...]
    name: str
    source: str
    status: str


@dataclass(frozen=True)
class TouchTimes:
    """Longest times by touch voltage, [volts, seconds] steps with rising volts; information, no shock protection.

    A voltage between two steps has the time of the higher one; beyond the last none.
    """

    points: tuple[tuple[float, float], ...] = ()
    source: str = ""
    status: str = ""
    applies_to: str = ""


@dataclass(frozen=True)
class UserSegment:
    """A piece of a user's own case at the tap: duration and line-to-neutral phasors [V], one a line."""

    duration_s: float
    l_n_v: tuple[complex, ...]


@dataclass(frozen=True)
class UserCase:
    """The user's own case at the relay's tap."""

    name: str
    expect: Literal["hold", "trip", "either"]
    source: str
    segments: tuple[UserSegment, ...]


@dataclass(frozen=True)
class ReferenceCases:
    """Figures of the must-hold sets the site asks for, from the tables: (level, seconds, source, status)."""

    dips: tuple[tuple[float, float, str, str], ...]
    """Residual percent of nominal and duration."""
    swells: tuple[tuple[float, float, str, str], ...]
    """Percent of nominal and duration."""
    interruption_s: float
    interruption_source: str
    interruption_status: str
    pole_late_s: float = 0.0
    """Spread of a switch's poles on closing."""
    pole_late_source: str = ""
    pole_late_status: str = ""


@dataclass(frozen=True)
class Site:
    """Everything the study needs to know of one installation."""

    document: Document
    supply: Supply
    source: Source
    boards: tuple[Board, ...]
    loads: tuple[Load, ...]
    motors: tuple[Motor, ...]
    faults: tuple[Fault, ...]
    relay: Relay | None
    equipment: Equipment
    reference: ReferenceCases
    user_cases: tuple[UserCase, ...]
    inputs: tuple[Input, ...]
    warnings: tuple[str, ...]
    digest: str
    """sha256 of site, loads and device files and of the table rows used."""
    files: tuple[str, ...] = ()
    """Paths of the files it was read from: no result may be written over them."""
    judgement: Judgement = field(default_factory=Judgement)
    relays: tuple[Relay, ...] = ()
    """Every relay of the site; ``relay`` is the one studied."""
    touch: TouchTimes = field(default_factory=TouchTimes)

    def with_relay(self, name: str) -> "Site":
        """The same site with the relay of that name as the one studied (KeyError for another name)."""
        return replace(self, relay={r.name: r for r in self.relays}[name])

    @property
    def every_relay(self) -> tuple[Relay, ...]:
        """All relays, the one studied first."""
        if self.relay is None:
            return self.relays
        return (self.relay, *(r for r in self.relays if r.name != self.relay.name))

    def board(self, name: str) -> Board:
        """The board of that name (names are checked when the site is read)."""
        return next(b for b in self.boards if b.name == name)

    def path(self, name: str) -> tuple[str, ...]:
        """Board names from the one fed from the source down to ``name``; empty for the source itself."""
        chain: list[str] = []
        while name != SOURCE:
            chain.append(name)
            name = self.board(name).fed_from
        return tuple(reversed(chain))

    def behind(self, name: str) -> tuple[str, ...]:
        """Boards behind the incoming switch of ``name``, itself first; all boards for the source."""
        found = [b.name for b in self.boards if name == SOURCE or name in self.path(b.name)]
        return tuple(sorted(found, key=lambda b: len(self.path(b))))

    @property
    def places(self) -> tuple[str, ...]:
        """Where a neutral can break: the star link, then every board that has an incoming cable."""
        return (SOURCE, *(b.name for b in self.boards if b.cable is not None))

    def conductor(self, place: str) -> Literal["N", "PEN"]:
        """PEN where the broken neutral also carries the protective conductor of what lies behind it."""
        if place == SOURCE:
            return "PEN" if self.supply.earthing == "TN-C-S" and self.source.earth_at == "star-point" else "N"
        behind = self.behind(place)
        cable = self.board(place).cable
        if cable is None or cable.pe_ohm is not None:
            return "N"
        return "PEN" if any(self.board(b).neutral_earth_link for b in behind) else "N"
