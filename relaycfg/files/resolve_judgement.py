"""Our own yardsticks, read from their rows."""

from relaycfg.files.tables import Tables
from relaycfg.model.judgement import Judgement


def resolve_judgement(tables: Tables) -> Judgement:
    """The yardsticks that words and tests of a result rest on."""
    return Judgement(
        tables.row("own-balanced").value / 100,
        tables.row("own-test-beyond").value,
        tables.row("own-margin-cap").value,
        tables.row("own-cover-kept").value / 100,
        tables.row("own-deadline-kept").value,
        tables.row("own-start-up-inhibit").value,
    )
