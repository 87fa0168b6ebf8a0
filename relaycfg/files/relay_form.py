"""What a site may say of its relay, of what equipment stands, and of what the relay must hold through."""

from typing import Literal

from relaycfg.files.keys import Form, Name, Pair, Text, key
from relaycfg.model.geometry import split_phase, three_phase

LINES = tuple(sorted(len(geometry.names) for geometry in (split_phase(), three_phase())))
"""Fewest and most lines of a system; how many a site has is checked with its system."""
EACH_LINE = f"[{', '.join(three_phase().names)}]"
FeedFrom = Literal["auxiliary", "L1-N", "L2-N", "L3-N", "L1-L2", "L2-L3", "L3-L1"]


class FeedForm(Form):
    """What feeds the relay or its trip coil."""

    from_: FeedFrom | None = key("the feed: auxiliary or lines of the system", alias="from", row="default-relay-feed")
    range_v: Pair | None = key(
        "volts it works in; required with a feed from the lines", unit="V", ask="[low, high] in volts",
        otherwise="not judged",
    )  # fmt: skip


class TripCoilForm(FeedForm):
    """What opens the switch."""

    kind: Literal["shunt", "undervoltage release", "contactor"] | None = key(
        "kind of coil", row="default-relay-trip-coil"
    )


class RelayForm(Form):
    """A voltage relay."""

    name: Name = key("name of the relay")
    measures_at: Name = key("board whose lines and neutral it measures", ask="the name of a board")
    device: Name = key("file that describes the device", ask="the path of a device file")
    trips: Name | None = key("board whose incoming switch it opens", otherwise="measures_at")
    poles: Literal["lines and neutral", "lines"] | None = key("what that switch opens", row="default-relay-poles")
    earth_reference: Literal["local PE", "own electrode"] | None = key(
        "earth that N is measured against, with displacement_from n-to-earth", row="default-relay-earth-reference"
    )
    supply: FeedForm = key("feed of the relay", default=FeedForm())
    trip_coil: TripCoilForm = key("feed and kind of the trip coil", default=TripCoilForm())
    output_s: float | None = key(
        "output relay of the device", unit="s", ask="seconds", ge=0, le=1, row="default-relay-output"
    )
    coil_and_breaker_s: float | None = key(
        "trip coil and breaker until the arc is out", unit="s", ask="seconds", ge=0, le=2, row="default-relay-breaker"
    )


class EquipmentForm(Form):
    """What connected equipment stands, line to neutral."""

    overvoltage: Name | None = key("named curve", ask="the name of a curve", row="default-equipment")
    points: list[Pair] | None = key(
        "own steps instead: from these volts on, cleared within these seconds", unit="V, s",
        ask="[[V, s], ...] with rising volts", length=(1, 20), otherwise="of the named curve",
    )  # fmt: skip
    sustained_high_v: float | None = key(
        "what may stay for ever", unit="V", ask="volts", gt=0, le=1000, otherwise="of the curve, else the first point"
    )
    sustained_high_s: float | None = key(
        "longest between that and the first point", unit="s", ask="seconds", gt=0, le=3600,
        otherwise="seconds of the first point",
    )  # fmt: skip
    sustained_low_v: float | None = key(
        "lowest volts that may stay for ever", unit="V", ask="volts", gt=0, le=600, otherwise="nobody minds"
    )
    sustained_low_s: float | None = key(
        "longest below that", unit="s", ask="seconds", gt=0, le=3600,
        otherwise="seconds of the first low point, else 80 % of row iti-lower",
    )  # fmt: skip
    points_low: list[Pair] | None = key(
        "own steps downwards", unit="V, s", ask="[[V, s], ...] with falling volts", length=(1, 20),
        otherwise="none",
    )  # fmt: skip


class MustHoldForm(Form):
    """Which reference disturbances the relay must hold through."""

    sets: list[Literal["public supply", "dips class 2", "dips class 3"]] = key(
        "sets of dips and swells; [] for none", ask="a list of set names", default=["public supply"]
    )
    interruption_s: float | None = key(
        "short interruption to hold through", unit="s", ask="seconds", ge=0, le=180, row="default-interruption"
    )


class SegmentForm(Form):
    """A piece of a case."""

    duration_s: float = key("how long", unit="s", ask="seconds", gt=0, le=86400)
    l_n_v: list[float] = key(
        "line-to-neutral volts", unit="V", ask=f"{EACH_LINE} in volts", length=(LINES[0], LINES[-1])
    )
    angle_deg: list[float] | None = key(
        "their angles", unit="deg", ask=f"{EACH_LINE} in degrees", length=(LINES[0], LINES[-1]),
        otherwise="those of the source, its neutral moved where the volts allow it",
    )  # fmt: skip


class CaseForm(Form):
    """The user's own case at the relay's tap."""

    name: Name = key("name of the case")
    expect: Literal["hold", "trip", "either"] = key("what the relay should do")
    source: Text = key("where it is from", default="user")
    segment: list[SegmentForm] = key("its pieces in order of time", ask="[[case.segment]] tables", length=(1, 50))
