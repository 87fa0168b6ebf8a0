"""The only place that opens files: reads sites, devices and settings, writes results, finds tables and templates."""

from relaycfg.files.name_lists import name_lists
from relaycfg.files.places import tables_dir, templates_dir
from relaycfg.files.schema import key_table, site_schema
from relaycfg.files.settings import read_settings, settings_text
from relaycfg.files.site import read_site
from relaycfg.files.starter import write_starter
from relaycfg.files.writing import check_new, write_new

__all__ = [
    "check_new",
    "key_table",
    "name_lists",
    "read_settings",
    "read_site",
    "settings_text",
    "site_schema",
    "tables_dir",
    "templates_dir",
    "write_new",
    "write_starter",
]
