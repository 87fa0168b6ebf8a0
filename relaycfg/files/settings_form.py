"""What a settings file may say: the stages of one relay as set."""

from typing import Literal

from relaycfg.files.keys import Form, Name, Text, key

DEFAULT_DELAY = "required when on"


class StageForm(Form):
    """One stage."""

    stage: int = key("number of the stage", ask="a whole number", ge=1, le=10)
    on: bool = key("whether the stage is in use", ask="true or false")
    pickup_percent: float | None = key(
        "pickup in percent of base_v; 47: in percent points", unit="%", ask="percent", gt=0, le=1000,
        otherwise="pickup_v",
    )  # fmt: skip
    delay_s: float | None = key("delay", unit="s", ask="seconds", ge=0, le=3600, otherwise=DEFAULT_DELAY)
    dropout_ratio: float | None = key(
        "drop-out over pickup", ask="a ratio", gt=0.3, lt=2, otherwise="the device's one nearest to 1"
    )
    reset: Literal["instantaneous", "held"] = key("what the timer does on drop-out", default="instantaneous")
    hold_s: float | None = key(
        "held: how long the timer keeps its time", unit="s", ask="seconds", ge=0, le=3600, otherwise="of the device"
    )
    phases: Literal["any", "all"] = key("any phase, or all of them", default="any")
    action: Literal["trip", "alarm"] = key("what it does", default="trip")


class VoltStageForm(StageForm):
    """One stage of 59 or 27."""

    pickup_v: float | None = key("pickup", unit="V", ask="volts", gt=0, le=10000, otherwise="pickup_percent")
    base_v: float | None = key("volts that are 100 percent", unit="V", ask="volts", gt=0, le=1000, otherwise="none")


class DisplacementStageForm(VoltStageForm):
    """One stage of 59N."""

    quantity: Literal["v0", "3v0"] | None = key("how the pickup is counted", otherwise="as the device counts")


class UnbalanceStageForm(StageForm):
    """One stage of 47."""

    definition: Literal["line-to-neutral deviation", "line-to-line deviation", "V2/V1", "spread"] | None = key(
        "which unbalance is meant", otherwise="that of the device"
    )


class StartUpForm(Form):
    """After the relay is energised."""

    inhibit_s: float = key("27 and 47 wait so long; never 59 or 59N", unit="s", ask="seconds", default=0.0, ge=0, le=60)


class ReconnectForm(Form):
    """After a trip."""

    after_any_trip: Literal["by hand", "automatic"] = key("how the switch closes again", default="by hand")
    delay_s: float = key("automatic: after volts are back for", unit="s", ask="seconds", default=0.0, ge=0, le=3600)
    attempts: int | None = key(
        "automatic: closings until it locks out", ask="a whole number", ge=1, le=100, otherwise="without limit"
    )


class SettingsForm(Form):
    """Settings of one relay."""

    schema_: Literal[1] = key("version of this file", alias="schema", ask="1")
    for_relay: Name = key("relay of the site", ask="the name of a relay")
    device: Name = key("name of its device", ask="the name of a device")
    input_digest: Text = key("digest of the inputs they were derived from", default="")
    overvoltage: list[VoltStageForm] = key("stages of 59", default=[])
    undervoltage: list[VoltStageForm] = key("stages of 27", default=[])
    displacement: list[DisplacementStageForm] = key("stages of 59N", default=[])
    unbalance: list[UnbalanceStageForm] = key("stages of 47", default=[])
    start_up: StartUpForm = key("after energising", default=StartUpForm())
    reconnect: ReconnectForm = key("after a trip", default=ReconnectForm())
