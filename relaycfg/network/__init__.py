"""Explicit-neutral network of a site: load states, breaks of the neutral, motor starts and short circuits."""

from relaycfg.network.faults import FaultKind, short_circuit
from relaycfg.network.network import Network, Solved, healthy_emf, motor_start, tap
from relaycfg.network.states import LoadStates, connected, corners, join, least, sampled

__all__ = [
    "FaultKind",
    "LoadStates",
    "Network",
    "Solved",
    "connected",
    "corners",
    "healthy_emf",
    "join",
    "least",
    "motor_start",
    "sampled",
    "short_circuit",
    "tap",
]
