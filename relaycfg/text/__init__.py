"""Results as terminal text and as JSON: nothing here computes, opens files or prints."""

from relaycfg.text.breaks import breaks_text
from relaycfg.text.check import check_text, sheet_text
from relaycfg.text.curves import curves_text
from relaycfg.text.derive import derive_text, settings_comments
from relaycfg.text.json_form import breaks_dict, study_dict
from relaycfg.text.reading import reading_text

__all__ = [
    "breaks_dict",
    "breaks_text",
    "check_text",
    "curves_text",
    "derive_text",
    "reading_text",
    "settings_comments",
    "sheet_text",
    "study_dict",
]
