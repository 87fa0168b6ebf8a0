"""Settings of voltage relays that disconnect a board when its neutral is lost."""

__version__ = "0.2.0"
