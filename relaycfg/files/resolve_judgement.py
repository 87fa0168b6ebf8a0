"""Our own yardsticks, read from their rows."""

from relaycfg.files.tables import Tables
from relaycfg.model.judgement import Judgement, Unsteady


def resolve_judgement(tables: Tables) -> Judgement:
    """The yardsticks that words and tests of a result rest on."""
    return Judgement(
        tables.row("own-balanced").value / 100,
        tables.row("own-test-beyond").value,
        tables.row("own-margin-cap").value,
        tables.row("own-cover-kept").value / 100,
        tables.row("own-deadline-kept").value,
        tables.row("own-start-up-inhibit").value,
        hot_joint_w=tables.row("own-hot-joint").value,
        reconnect_shown_s=tables.row("own-reconnect-shown").value,
        dip_shown_pu=tables.row("own-dip-shown").value / 100,
        high_shown_pu=tables.row("own-high-shown").value / 100,
        unsteady=_unsteady(tables),
    )


def _unsteady(tables: Tables) -> Unsteady:
    """What loads that are no impedances are played by."""
    low, high = tables.row("own-band-edge-range").value
    trip = tables.row("stall-trip").values
    return Unsteady(
        tables.row("own-electronic-share").value / 100,
        (low, high),
        tables.row("own-switching-time").value,
        tables.row("own-voltage-step").value,
        tables.row("stall").values["after_s"],
        (trip["trip_s"], trip["trip_longest_s"]),
    )
