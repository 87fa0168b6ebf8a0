"""What a device file may say: what a relay can measure and be set to."""

from typing import Annotated, Literal

from pydantic import Field

from relaycfg.files.keys import Form, Name, Text, key


class RangeForm(Form):
    """What a pickup knob can be set to."""

    min: float = key("lowest setting", ask="a number in the unit of the knob", ge=0, le=10000)
    max: float = key("highest setting", ask="a number in the unit of the knob", gt=0, le=10000)
    step: float = key("step", ask="a number in the unit of the knob", gt=0, le=1000)
    unit: Literal["v", "percent"] = key("what the knob is marked in", default="v")
    base_v: float | None = key(
        "volts that are 100 percent; required with unit percent, not for 47", unit="V", ask="volts", gt=0, le=1000,
        otherwise="none",
    )  # fmt: skip


class DelayForm(Form):
    """What a delay knob can be set to."""

    min: float = key("shortest", unit="s", ask="seconds", ge=0, le=3600)
    max: float = key("longest", unit="s", ask="seconds", gt=0, le=3600)
    step: float = key("step", unit="s", ask="seconds", gt=0, le=600)


class AccuracyForm(Form):
    """Declared errors."""

    pickup_percent: float = key("of the pickup setting", unit="%", ask="percent", default=0.0, ge=0, le=20)
    pickup_v: float | None = key(
        "absolute (59, 27, 59N)", unit="V", ask="volts", ge=0, le=50,
        otherwise="0; 59N from L-N channels: row displacement-from-l-n",
    )  # fmt: skip
    pickup_points: float = key("absolute (47)", unit="%", ask="percent points", default=0.0, ge=0, le=20)
    time_percent: float = key("of the delay setting", unit="%", ask="percent", default=0.0, ge=0, le=50)
    time_s: float = key("absolute", unit="s", ask="seconds", default=0.0, ge=0, le=10)
    combine: Literal["greater", "sum"] = key("how percent and absolute combine", default="greater")


class ElementForm(Form):
    """One element of the device."""

    function: Literal["59", "27", "59N", "47"] = key("function number")
    stages: int = key("number of stages", ask="a whole number", default=1, ge=1, le=10)
    pickup: RangeForm = key("settable pickups", ask='{ min, max, step, unit = "v" }')
    delay_s: DelayForm = key("settable delays", ask="{ min, max, step } in seconds")
    dropout_ratio: list[Annotated[float, Field(gt=0.3, lt=2)]] | None = key(
        "settable drop-out over pickup: below 1, for 27 above 1", ask="a list of ratios", length=(1, 200),
        otherwise="rows default-device-dropout-over, default-device-dropout-under",
    )  # fmt: skip
    reset: list[Literal["instantaneous", "held"]] = key(
        "what the timer does on drop-out", ask="a list", default=["instantaneous"], length=(1, 2)
    )
    hold_s: float = key("held: how long the timer keeps its time", unit="s", ask="seconds", default=0.0, ge=0, le=3600)
    curves: list[Literal["definite", "dependent"]] = key(
        "time curves; the program sets definite time only", ask="a list", default=["definite"], length=(1, 2)
    )
    accuracy: AccuracyForm = key("declared errors", ask="{ pickup_percent, pickup_v, time_percent, time_s }")
    quantity: Literal["l-n", "l-l", "v0", "3v0"] | None = key(
        "what it acts on", otherwise="59 and 27: first of measures; 59N: displacement_quantity"
    )
    definition: Literal["line-to-neutral deviation", "line-to-line deviation", "V2/V1", "spread"] | None = key(
        "47: which unbalance it counts", otherwise="line-to-neutral deviation, line-to-line if it measures only l-l"
    )
    terminal: Text = key("terminals, as printed on the device", default="")
    knob: Text = key("knob, as printed on the device", default="")


class DeviceForm(Form):
    """A relay type."""

    schema_: Literal[1] = key("version of this file", alias="schema", ask="1")
    name: Name = key("name of the device")
    measures: list[Literal["l-n", "l-l"]] = key("what it measures", ask="a list", length=(1, 2))
    detector: Literal["rms", "fundamental"] | None = key("what it takes of the wave", row="default-device-detector")
    window_cycles: float | None = key(
        "measuring window", unit="cycles", ask="cycles", gt=0, le=100, row="default-device-window"
    )
    refresh_cycles: float | None = key(
        "time between measurements", unit="cycles", ask="cycles", gt=0, le=100, row="default-device-refresh"
    )
    timers: Literal["per phase", "shared"] | None = key("timers of the phases", row="default-device-timers")
    displacement_from: Literal["l-n", "n-to-earth"] = key("what the displacement is measured from", default="l-n")
    displacement_quantity: Literal["v0", "3v0"] = key("how the displacement is counted", default="v0")
    element: list[ElementForm] = key("the elements", length=(1, 4))
