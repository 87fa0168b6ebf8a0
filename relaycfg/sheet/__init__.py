"""The setting sheet: a PDF an approver can read from page 1, made from a study alone."""

from relaycfg.sheet.render import render

__all__ = ["render"]
