"""What a site may say of loads, motors and the short circuits behind its boards."""

from typing import Annotated, Literal

from pydantic import Field

from relaycfg.files.keys import OHMS, Form, Name, Pair, Text, key

Between = Literal["L1-N", "L2-N", "L3-N", "L1-L2", "L2-L3", "L3-L1", "L1-L2-L3", "L1-L2-L3-N"]
Share = Annotated[float, Field(ge=0, le=1)]


class LoadsForm(Form):
    """A table of loads in a file beside the site."""

    file: Name = key("CSV or .xlsx whose columns are the keys of [[load]]", ask="the path of a CSV or .xlsx file")
    sheet: Name | None = key(".xlsx: name of the sheet", otherwise="the first")


class LoadForm(Form):
    """One load, in the site or as a line of the loads file."""

    board: Name = key("board it hangs on", ask="the name of a board")
    name: Name | None = key("name of the load", otherwise="load and its number")
    between: Between = key("lines it lies between")
    kw: float | None = key(
        "power at its own nominal voltage, total of its phases; negative: generation", unit="kW", ask="kW",
        ge=-10000, le=10000, otherwise="one of kw, current_a, ohm",
    )  # fmt: skip
    current_a: float | None = key(
        "instead of kw: RMS current in each of its lines", unit="A", ask="amperes", gt=0, le=20000,
        otherwise="one of kw, current_a, ohm",
    )  # fmt: skip
    ohm: Pair | None = key(
        "instead of kw: constant impedance (three-phase: star, each phase); x below 0 is capacitive", unit="ohm",
        ask=OHMS, otherwise="one of kw, current_a, ohm",
    )  # fmt: skip
    pf: float | None = key(
        "power factor", ask="a power factor", gt=0, le=1, otherwise="of the kind, else row default-load-pf"
    )
    reactive: Literal["lagging", "leading"] = key("sign of the reactive power", default="lagging")
    kind: Name | None = key("named kind of load", ask="the name of a kind", row="default-load-kind")
    zip_p: list[float] | None = key(
        "instead of kind: shares of constant impedance, current, power in P, of sum 1", ask="[z, i, p]", length=3,
        otherwise="of the kind",
    )  # fmt: skip
    zip_q: list[float] | None = key("the same for Q", ask="[z, i, p]", length=3, otherwise="zip_p, or of the kind")
    band_pu: Pair | None = key(
        "where that law holds; outside, the constant impedance of the edge", unit="pu", ask="[low, high]",
        otherwise="of the kind; row default-load-band with zip_p",
    )  # fmt: skip
    usage: Share | None = key("share of time it is on", ask="a share", row="default-load-usage")
    demand: Share | None = key("share of its rating while on", ask="a share", row="default-load-demand")
    group: Text = key("loads of one group switch together and share one usage", default="")
    third_harmonic_percent: float | None = key(
        "third harmonic current of the fundamental", unit="%", ask="percent", ge=0, le=200,
        row="default-load-third-harmonic",
    )  # fmt: skip
    minds_low_v: bool = key("low voltage harms it", default=False)
    cutout_pu: float | None = key(
        "volts below which it drops out while the neutral is lost", unit="pu", ask="per unit", gt=0, lt=1,
        otherwise="of the kind, else it never does",
    )  # fmt: skip
    restart_s: float | None = key(
        "it starts again so long after its volts are back in its band", unit="s", ask="seconds", gt=0, le=3600,
        otherwise="of the kind, else it stays out",
    )  # fmt: skip
    damage_pu: float | None = key(
        "volts at which it fails open", unit="pu", ask="per unit", gt=1, le=3,
        otherwise="of the kind, else it stands all",
    )  # fmt: skip
    count: int = key("so many alike, switched together", ask="a whole number", default=1, ge=1, le=10000)


class StartForm(Form):
    """Start of a motor, direct on line."""

    current_ratio: float | None = key(
        "starting over rated current", ask="a ratio", ge=1, le=15, row="locked-rotor-ratio"
    )
    pf: float | None = key(
        "power factor while starting", ask="a power factor", gt=0, le=1, row="default-motor-start-pf"
    )
    duration_s: float | None = key(
        "how long it starts", unit="s", ask="seconds", gt=0, le=120,
        otherwise="middle of row start-time-light (from memory)",
    )  # fmt: skip


class MotorForm(Form):
    """A motor."""

    board: Name = key("board it hangs on", ask="the name of a board")
    name: Name | None = key("name of the motor", otherwise="motor and its number")
    between: Between = key("lines it lies between", default="L1-L2-L3")
    shaft_kw: float = key("rated power at the shaft", unit="kW", ask="kW", gt=0, le=5000)
    pf: float | None = key("running power factor", ask="a power factor", gt=0, le=1, row="default-motor-pf")
    efficiency: float | None = key("efficiency", ask="a share", gt=0, le=1, row="default-motor-efficiency")
    usage: Share | None = key("share of time it runs", ask="a share", row="default-motor-usage")
    count: int = key("so many alike, each started on its own", ask="a whole number", default=1, ge=1, le=100)
    start: StartForm = key("its start", default=StartForm())


class FaultForm(Form):
    """A short circuit behind a board that the relay must ride through."""

    board: Name = key("board whose circuit is short-circuited", ask="the name of a board")
    circuit_ohm: Pair = key("circuit to the fault, one way, line and neutral each", unit="ohm", ask=OHMS)
    clearing_s: float = key("time in which its own device clears it", unit="s", ask="seconds", gt=0, le=60)
