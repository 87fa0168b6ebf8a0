"""What a voltage relay measures, how far it may err, and when it trips on a course of voltages."""

from relaycfg.relay.bands import (
    Band,
    least_sensitive,
    longest_delay,
    measuring_s,
    most_sensitive,
    pickup_at_least_sensitive,
    pickup_at_most_sensitive,
    pickups_least_sensitive,
    pickups_most_sensitive,
    refresh_s,
    shortest_delay,
    total_clearing,
    window_s,
)
from relaycfg.relay.course import play
from relaycfg.relay.machine import run
from relaycfg.relay.quantities import Measured, definitions, measured_quantities, severities
from relaycfg.relay.trip_tables import TripTable, trip_table

__all__ = [
    "Band",
    "Measured",
    "TripTable",
    "definitions",
    "least_sensitive",
    "longest_delay",
    "measured_quantities",
    "measuring_s",
    "most_sensitive",
    "pickup_at_least_sensitive",
    "pickup_at_most_sensitive",
    "pickups_least_sensitive",
    "pickups_most_sensitive",
    "play",
    "refresh_s",
    "run",
    "severities",
    "shortest_delay",
    "total_clearing",
    "trip_table",
    "window_s",
]
