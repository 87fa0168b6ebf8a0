"""What derive writes, check reads: also for an element of the device that the system leaves without a quantity."""

from relaycfg.files import read_settings, settings_text
from relaycfg.study import derive
from tests.study import two_lines


def test_settings_of_a_left_out_displacement_element_that_counts_3v0_are_read_back(tmp_path):
    site = two_lines.site(tmp_path / "site", "2ph-3w", quantity="3v0")
    study = derive(site, 20, 1)
    path = tmp_path / "settings.toml"
    path.write_text(settings_text(study.settings, site, {}), "utf-8")
    assert read_settings(path, site).stages == study.settings.stages
