"""The keys of closing again in a settings file: read, written back alike, part of the digest."""

from dataclasses import replace

import pytest

from relaycfg.errors import InputError
from relaycfg.files import read_settings
from relaycfg.files.settings import settings_text
from tests.cautions import bench

HEAD = 'schema = 1\nfor_relay = "R1"\ndevice = "Test relay"\n'


def read(site, tmp_path, keys):
    path = tmp_path / "written.toml"
    path.write_text(HEAD + keys)
    return read_settings(path, site)


def test_attempts_are_read_and_written_back(tmp_path):
    site = bench.star(tmp_path / "site")
    for keys, attempts in (("attempts = 3\n", 3), ("", None)):
        given = f'[reconnect]\nafter_any_trip = "automatic"\ndelay_s = 60\n{keys}'
        settings = read(site, tmp_path, given)
        assert (settings.after_any_trip, settings.reconnect_delay_s) == ("automatic", 60.0)
        assert settings.reconnect_attempts == attempts
        path = tmp_path / "again.toml"
        path.write_text(settings_text(settings, site))
        assert read_settings(path, site) == settings


def test_two_settings_that_differ_in_attempts_have_two_digests(tmp_path):
    site = bench.star(tmp_path / "site")
    settings = read(site, tmp_path, '[reconnect]\nafter_any_trip = "automatic"\nattempts = 3\n')
    assert settings.digest != replace(settings, reconnect_attempts=4).digest


@pytest.mark.parametrize("attempts", ["0", "101", "1.5", '"3"'])
def test_attempts_are_whole_and_at_least_one(tmp_path, attempts):
    site = bench.star(tmp_path / "site")
    with pytest.raises(InputError, match="attempts"):
        read(site, tmp_path, f'[reconnect]\nafter_any_trip = "automatic"\nattempts = {attempts}\n')
