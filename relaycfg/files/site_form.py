"""What site.toml may say: every table and key with its unit, range and default."""

import datetime
from typing import Literal

from relaycfg.files.electrode_form import ElectrodeForm
from relaycfg.files.keys import OHMS, Form, Name, OwnName, Pair, Text, key
from relaycfg.files.limits import NOMINAL_V
from relaycfg.files.load_form import FaultForm, LoadForm, LoadsForm, MotorForm
from relaycfg.files.relay_form import CaseForm, EquipmentForm, MustHoldForm, RelayForm
from relaycfg.model.geometry import System


class PersonForm(Form):
    """One who signs."""

    name: Text = key("name, printed as given", default="")
    role: Text = key("role, printed as given", default="")


class DocumentForm(Form):
    """Identity of the setting sheet."""

    title: Text = key("title of the sheet", default="Voltage relay settings")
    number: Text = key("document number; names the PDF", default="settings")
    revision: Text = key("revision; names the PDF", default="0")
    status: Text = key("printed as stated, never raised by the program", default="draft")
    date: datetime.date | None = key(
        "printed as given; blank when omitted", ask="a date such as 2026-11-30", default=None
    )
    site: Text = key("name of the site", default="")
    paper: Literal["A4", "Letter"] = key("paper of the sheet", default="A4")
    fault_contact: Text = key("whom to call about the supply", default="")
    prepared: PersonForm = key("who prepared the sheet", default=PersonForm())
    checked: PersonForm = key("who checked it", default=PersonForm())
    approved: PersonForm = key("who approved it", default=PersonForm())
    accepted: PersonForm = key("who accepted it", default=PersonForm())


class SupplyForm(Form):
    """What the supply promises."""

    system: System = key(
        "lines and neutral of a star with three; split phase (two legs of one winding); two lines of a star",
        default="3ph-4w",
    )
    nominal_v: float = key(
        "nominal voltage, line to neutral",
        unit="V",
        ask="volts from line to neutral",
        ge=NOMINAL_V[0],
        le=NOMINAL_V[1],
    )
    frequency_hz: float | None = key(
        "nominal frequency", unit="Hz", ask="hertz", ge=40, le=70, row="default-supply-frequency"
    )
    phase_order: Literal["L1-L2-L3", "L1-L3-L2"] | None = key("order of the lines", row="default-supply-phase-order")
    earthing: Literal["TN-C-S", "TN-S", "TT"] = key("system earthing")
    band: Name | None = key(
        "named supply band", ask="the name of a band", otherwise="EN 50160 all at 50 Hz, ANSI C84.1 Range B at 60 Hz"
    )
    low_percent: float | None = key(
        "own lower limit instead of a band", unit="%", ask="a negative percent of nominal", ge=-30, le=0,
        otherwise="the band",
    )  # fmt: skip
    high_percent: float | None = key(
        "own upper limit instead of a band", unit="%", ask="a percent of nominal", ge=0, le=30, otherwise="the band"
    )
    band_at: Name | None = key("where the band is promised: source or a board", row="default-supply-band-at")
    unbalance_percent: float | None = key(
        "V2/V1 there, inside the band; not for 1ph-3w",
        unit="%",
        ask="percent",
        ge=0,
        le=10,
        row="en-50160-unbalance",
    )
    displacement_percent: float | None = key(
        "V0/V1 there, from the network upstream", unit="%", ask="percent", ge=0, le=20,
        row="default-supply-displacement",
    )  # fmt: skip


class SourceForm(Form):
    """Where the power comes from."""

    name: OwnName = key("name of the source", default="grid")
    kind: Literal["transformer", "generator", "impedance"] = key("kind of source")
    no_load_v: float | None = key(
        "line to neutral at no load, at the tap in use", unit="V", ask="volts from line to neutral", ge=50, le=700,
        otherwise="supply.nominal_v",
    )  # fmt: skip
    rating_kva: float | None = key(
        "rating of a transformer or generator",
        unit="kVA",
        ask="kVA",
        gt=0,
        le=10000,
        otherwise="required for those kinds",
    )
    impedance_percent: float | None = key(
        "transformer: short-circuit impedance", unit="%", ask="percent", gt=0, le=30,
        otherwise="row iec-60076-5-minimum (from memory)",
    )  # fmt: skip
    x_over_r: float | None = key(
        "X/R of the positive sequence", ask="a ratio", gt=0, le=100,
        otherwise="transformer: middle of row catalogue-range; generator: row default-generator-x-over-r",
    )  # fmt: skip
    zero_sequence_ratio: float | None = key(
        "transformer: Z0/Z1", ask="a ratio", gt=0, le=50, otherwise="rows zero-sequence-* by vector group"
    )
    vector_group: Name | None = key(
        "transformer: vector group", ask="one such as Dyn11, Yzn5 or Yyn0", row="default-source-vector-group"
    )
    class_: Literal["G1", "G2", "G3"] | None = key(
        "generator: performance class of ISO 8528-5", alias="class", row="default-generator-class"
    )
    reactance_percent: float | None = key(
        "generator: transient reactance X'd", unit="%", ask="percent", gt=0, le=100, row="default-generator-reactance"
    )
    line_ohm: Pair | None = key("impedance: each line", unit="ohm", ask=OHMS, otherwise="required for that kind")
    neutral_ohm: Pair | None = key(
        "impedance and generator: neutral, from the star of the EMFs to the star point", unit="ohm", ask=OHMS,
        otherwise="zero; transformer: from zero_sequence_ratio",
    )  # fmt: skip
    star_link_ohm: float | None = key(
        "link from star point to neutral bar", unit="ohm", ask="ohms", ge=0, le=10, row="default-source-star-link"
    )
    electrode_ohm: float | None = key(
        "earth electrode of the source", unit="ohm", ask="ohms", gt=0, le=10000, row="default-source-electrode"
    )
    electrode: ElectrodeForm | None = key("its rods and soil, instead of electrode_ohm", default=None)
    earth_at: Literal["neutral-bar", "star-point"] | None = key(
        "side of the star link that carries electrode and PE", row="default-source-earth-at"
    )


class CableForm(Form):
    """Incoming cable of a board, by sections or in ohms."""

    length_m: float | None = key(
        "length, with sections", unit="m", ask="metres", gt=0, le=20000, otherwise="required without line_ohm"
    )
    line_mm2: float | None = key(
        "section of each line", unit="mm2", ask="mm2", gt=0, le=2000, otherwise="required without line_ohm"
    )
    neutral_mm2: float | None = key(
        "section of the neutral (or PEN)", unit="mm2", ask="mm2", gt=0, le=2000, otherwise="line_mm2"
    )
    pe_mm2: float | None = key(
        "section of the PE; without it the cable has none", unit="mm2", ask="mm2", gt=0, le=2000, otherwise="no PE"
    )
    metal: Literal["Cu", "Al"] | None = key("conductor metal", row="default-cable-metal")
    temperature_c: float | None = key(
        "conductor temperature under load", unit="C", ask="degrees C", ge=-40, le=150, row="default-cable-temperature"
    )
    reactance_ohm_per_km: float | None = key(
        "reactance of each conductor", unit="ohm/km", ask="ohms a km", ge=0, le=2, row="reactance-multicore"
    )
    line_ohm: Pair | None = key(
        "each line, instead of sections; taken at load and for faults", unit="ohm", ask=OHMS,
        otherwise="from the section",
    )  # fmt: skip
    neutral_ohm: Pair | None = key("neutral (or PEN), with line_ohm", unit="ohm", ask=OHMS, otherwise="line_ohm")
    pe_ohm: Pair | None = key("PE, with line_ohm", unit="ohm", ask=OHMS, otherwise="no PE")


class BoardForm(Form):
    """A distribution board."""

    name: OwnName = key("name of the board")
    fed_from: Name = key("source or the board that feeds it", ask='"source" or the name of a board')
    neutral_earth_link: bool = key("N-PE link in this board; TN-C-S: the PEN ends here", default=False)
    electrode_ohm: float | None = key(
        "own earth electrode on its PE", unit="ohm", ask="ohms", gt=0, le=10000, otherwise="none"
    )
    electrode: ElectrodeForm | None = key("its rods and soil, instead of electrode_ohm", default=None)
    touch_limit_v: float | None = key(
        "touch voltage that may stay at what it feeds; 25 where it is wet", unit="V", ask="volts", gt=0, le=120,
        row="touch-limit",
    )  # fmt: skip
    cable: CableForm | None = key("incoming cable; without it the board is the node of its feeder", default=None)


class EvidenceForm(Form):
    """How well an input is known."""

    of: Name = key("the input, such as supply.nominal_v or board.MB.cable", ask="the field of an input")
    tag: Literal["measured", "nameplate", "letter", "assumed"] = key("how it is known")
    note: Text = key("instrument, date, letter", default="")


class SiteForm(Form):
    """A site."""

    document: DocumentForm = key("identity of the sheet", default=DocumentForm())
    supply: SupplyForm = key("the supply")
    source: list[SourceForm] = key("the source; one")
    board: list[BoardForm] = key("the boards")
    loads: LoadsForm | None = key("loads in a file", default=None)
    load: list[LoadForm] = key("loads", default=[])
    motor: list[MotorForm] = key("motors", default=[])
    fault: list[FaultForm] = key("short circuits; none: assumed from the disconnection times", default=[])
    relay: list[RelayForm] = key("the relays; the first is the one studied", default=[])
    equipment: EquipmentForm = key("what equipment stands", default=EquipmentForm())
    must_hold: MustHoldForm = key("reference disturbances", default=MustHoldForm())
    case: list[CaseForm] = key("own cases", default=[])
    evidence: list[EvidenceForm] = key("how well inputs are known", default=[])
