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


def refused(path, force=True, inputs=()):
    with pytest.raises(InputError) as caught:
        check_new(Path(path), force, inputs)
    with pytest.raises(InputError) as again:
        write_new(Path(path), "new", force, inputs)
    assert caught.value.text() == again.value.text()
    return caught.value.text()


def test_what_is_no_file_is_never_replaced(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("folder").mkdir()
    os.mkfifo("pipe")
    Path("to-null").symlink_to("/dev/null")
    assert refused("folder") == "folder: a folder; give the name of a file"
    assert refused("pipe") == "pipe: a pipe; give the name of a file"
    assert refused("/dev/null") == "/dev/null: a device; give the name of a file"
    assert refused("to-null") == "to-null: a device; give the name of a file"
    assert sorted(p.name for p in tmp_path.iterdir()) == ["folder", "pipe", "to-null"]


def test_a_link_stays_and_its_target_is_written(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("there").mkdir()
    Path("there/real.toml").write_text("old", "utf-8")
    Path("link.toml").symlink_to("there/real.toml")
    assert refused("link.toml", force=False) == (
        "link.toml: already there; add --force to replace it, or give another name"
    )
    write_new(Path("link.toml"), "new", force=True)
    assert Path("link.toml").is_symlink()
    assert Path("there/real.toml").read_text("utf-8") == "new"
    assert [p.name for p in Path("there").iterdir()] == ["real.toml"]


def test_a_link_to_nothing_counts_as_there(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("link.toml").symlink_to("later.toml")
    Path("lost.toml").symlink_to("gone/later.toml")
    Path("round.toml").symlink_to("round.toml")
    assert refused("link.toml", force=False).startswith("link.toml: already there; ")
    write_new(Path("link.toml"), "new", force=True)
    assert Path("later.toml").read_text("utf-8") == "new"
    assert refused("lost.toml").startswith("lost.toml: in a folder that is not there; ")
    assert refused("round.toml") == "round.toml: a link that leads back to itself; give another name"


def test_an_input_is_never_written_over_by_whatever_name(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("site.toml").write_text("mine", "utf-8")
    Path("link.toml").symlink_to("site.toml")
    os.link("site.toml", "hard.toml")
    inputs = (Path("loads.csv"), "site.toml")
    for name in ("site.toml", "./site.toml", str(tmp_path / "site.toml"), "link.toml", "hard.toml"):
        assert refused(name, inputs=inputs) == (
            f"{Path(name)}: one of the files read for it; give another name: an input is never replaced"
        )
    assert Path("site.toml").read_text("utf-8") == "mine"
    write_new(Path("settings.toml"), "new", force=False, inputs=inputs)


def test_a_name_as_long_as_the_file_system_takes_is_written_and_a_longer_one_answered(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    write_new(Path("a" * 250 + ".toml"), "new", force=False)
    assert refused("a" * 251 + ".toml") == f"{'a' * 251}.toml: a name that is too long; give a shorter one"
    assert refused("b/" * 3000 + "a").endswith(": a name that is too long; give a shorter one")
    assert refused("a\0b") == "a b: not a usable path; give another path"
