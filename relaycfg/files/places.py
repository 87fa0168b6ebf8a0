"""Where the shipped tables and templates lie, installed or in a checkout."""

from pathlib import Path

PACKAGE = Path(__file__).resolve().parent.parent


def tables_dir() -> Path:
    """Folder of the published values."""
    return PACKAGE / "tables"


def templates_dir() -> Path:
    """Folder of the wording and of the starter files: inside the package when installed, beside it in a checkout."""
    installed = PACKAGE / "templates"
    return installed if installed.is_dir() else PACKAGE.parent / "templates"
