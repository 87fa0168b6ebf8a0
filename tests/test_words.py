"""Words that shipped files do not use: promises, traces of the machine they were made on, and of how they began."""

import re
from pathlib import Path

import pytest

TOP = Path(__file__).resolve().parent.parent
FOLDERS = ("relaycfg", "templates", "examples")
TEXTS = (".py", ".toml", ".j2", ".csv", ".json", ".md", ".txt", "")
NOT_OURS = ("LICENSE",)
"""Licence texts are shipped word for word."""
PROMISES = r"\b(safe|complies)\b"
MACHINES = r"(?<![\w.~-])/(work|home|root|opt|tmp|usr|mnt)/|file://"
REGISTRIES = r"pypi\.|pythonhosted|proxy\.golang|npmjs|conda\.anaconda|index-url|artifactory"
ORIGINS = r"\b(transcr[i]pts?|lect[u]res?|seed d[o]cument|the t[a]lk)\b"


def shipped():
    """Every shipped text file, README included."""
    found = [p for folder in FOLDERS for p in sorted((TOP / folder).rglob("*")) if p.is_file()]
    return [p for p in (*found, TOP / "README.md") if p.suffix in TEXTS and p.name not in NOT_OURS]


def test_there_is_something_to_look_at():
    assert len(shipped()) > 100


@pytest.mark.parametrize("pattern", [PROMISES, MACHINES, REGISTRIES, ORIGINS])
def test_no_shipped_file_says_it(pattern):
    said = [
        f"{path.relative_to(TOP)}:{number}: {line.strip()}"
        for path in shipped()
        for number, line in enumerate(path.read_text("utf-8").splitlines(), 1)
        if re.search(pattern, line, re.IGNORECASE)
    ]
    assert said == []
