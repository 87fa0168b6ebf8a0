"""Settings of one relay: what derive writes and check reads."""

import hashlib
from dataclasses import dataclass
from typing import Literal

from relaycfg.model.device import Function, Reset


@dataclass(frozen=True)
class Stage:
    """One stage of one element as set. ``pickup`` is in volts as the element's quantity counts them (3V0 volts
    where the quantity is "3v0"), percent points for 47; a stage that is off keeps no other meaning."""

    function: Function
    number: int
    on: bool
    pickup: float = 0.0
    delay_s: float = 0.0
    dropout_ratio: float = 1.0
    reset: Reset = "instantaneous"
    hold_s: float = 0.0
    phases: Literal["any", "all"] = "any"
    action: Literal["trip", "alarm"] = "trip"
    quantity: str = ""
    pickup_percent: float | None = None
    """As written by the user where the settings are in percent; ``base_v`` is its base."""
    base_v: float | None = None

    @property
    def label(self) -> str:
        """Short name such as "59 stage 2"."""
        return f"{self.function.value} stage {self.number}"


@dataclass(frozen=True)
class Settings:
    """All stages of one relay with its start-up and reconnection rules."""

    for_relay: str
    device: str
    input_digest: str
    stages: tuple[Stage, ...]
    inhibit_s: float
    """Start-up inhibit of 27 and 47; never of 59 or 59N."""
    after_any_trip: Literal["by hand", "automatic"]
    reconnect_delay_s: float = 0.0
    reconnect_attempts: int | None = None
    """Closings by itself before it locks out; None without limit."""

    def of(self, function: Function) -> tuple[Stage, ...]:
        """Stages of one element in order of their number."""
        return tuple(sorted((s for s in self.stages if s.function is function), key=lambda s: s.number))

    @property
    def digest(self) -> str:
        """sha256 of everything set, so that two sheets of one site with different settings can be told apart."""
        closing = (self.after_any_trip, self.reconnect_delay_s, self.reconnect_attempts)
        rows = repr((self.for_relay, self.device, self.stages, self.inhibit_s, *closing))
        return f"sha256:{hashlib.sha256(rows.encode()).hexdigest()}"

    @property
    def active(self) -> tuple[Stage, ...]:
        """Stages that are on and trip."""
        return tuple(s for s in self.stages if s.on and s.action == "trip")
