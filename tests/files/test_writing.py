"""Results are written whole or not at all."""

import os
from pathlib import Path

import pytest

from relaycfg.errors import InputError
from relaycfg.files import check_new, write_new


def test_a_file_is_written_and_nothing_else_is_left(tmp_path):
    write_new(tmp_path / "a.pdf", b"\x00\x01", force=False)
    write_new(tmp_path / "b.toml", "ü = 1\n", force=False)
    assert (tmp_path / "a.pdf").read_bytes() == b"\x00\x01"
    assert (tmp_path / "b.toml").read_text("utf-8") == "ü = 1\n"
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.pdf", "b.toml"]


def test_a_file_that_is_there_is_kept_without_force(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("a.toml").write_text("old", "utf-8")
    with pytest.raises(InputError) as caught:
        write_new(Path("a.toml"), "new", force=False)
    assert caught.value.text() == "a.toml: already there; add --force to replace it, or give another name"
    assert Path("a.toml").read_text("utf-8") == "old"
    write_new(Path("a.toml"), "new", force=True)
    assert Path("a.toml").read_text("utf-8") == "new"


def test_a_failing_write_leaves_the_old_file_and_no_part(tmp_path, monkeypatch):
    (tmp_path / "a.toml").write_text("old", "utf-8")

    def full(_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(InputError, match=r"a.toml: not writable \(no space left on device\)"):
        write_new(tmp_path / "a.toml", "new", force=True)
    assert (tmp_path / "a.toml").read_text("utf-8") == "old"
    assert len(list(tmp_path.iterdir())) == 1


def test_a_missing_folder_and_a_folder_as_file_are_answered(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    for path, sentence in (
        ("q/a.toml", "q/a.toml: in a folder that is not there; make q first, or give another path"),
        (".", ".: a folder; give the name of a file"),
    ):
        with pytest.raises(InputError) as caught:
            check_new(Path(path), force=True)
        assert caught.value.text() == sentence
