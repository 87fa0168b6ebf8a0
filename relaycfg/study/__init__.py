"""The study of one site: must-hold cases, corridor, choice on the device's steps, verdicts; pure functions."""

from relaycfg.study.breaks import breaks
from relaycfg.study.reading import read_meter
from relaycfg.study.study import check, derive
from relaycfg.study.two_line_reading import read_board

__all__ = ["breaks", "check", "derive", "read_board", "read_meter"]
