"""Explicit-neutral network of a site: load states, breaks of the neutral, motor starts and short circuits."""

from relaycfg.network.circuit import blown_fuse, open_line
from relaycfg.network.faults import FaultKind, short_circuit
from relaycfg.network.network import Network, Solved, healthy_emf, motor_start, tap
from relaycfg.network.states import LoadStates, connected, corners, join, least, sampled

__all__ = [
    "FaultKind",
    "LoadStates",
    "Network",
    "Solved",
    "blown_fuse",
    "connected",
    "corners",
    "healthy_emf",
    "join",
    "least",
    "motor_start",
    "open_line",
    "sampled",
    "short_circuit",
    "tap",
]
