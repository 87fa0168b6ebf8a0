"""The verdict on existing settings as terminal text: exceptions first, with what to turn to what."""

from relaycfg.model.results import Study
from relaycfg.text.after_break import after_break
from relaycfg.text.after_trip import after_trip
from relaycfg.text.earthing import earth_reference, touch
from relaycfg.text.findings import blind_spots, break_classes, coverage, failing_cases, findings, passing_cases
from relaycfg.text.joints import loose_joints
from relaycfg.text.places import seen_by, together
from relaycfg.text.stages import identity, margins, settings_table, verdict


def check_text(study: Study) -> str:
    """Exceptions, failing cases, the settings and their margins, breaks place by place, what is not detected."""
    lines = [*identity(study), *verdict(study)]
    lines += findings(study.findings, "exception", "warning")
    lines += [*failing_cases(study.cases), *settings_table(study), *margins(study.stages, alone=True)]
    lines += passing_cases(study.cases)
    lines += [*break_classes(study), *seen_by(study), *coverage(study), *together(study), *blind_spots(study)]
    lines += [*loose_joints(study), *touch(study), *earth_reference(study)]
    lines += after_break(study)
    lines += [*after_trip(study)]
    lines += findings(study.findings, "note")
    return "\n".join(lines) + "\n"


def sheet_text(study: Study) -> str:
    """What stands on page 1 of the sheet: how many exceptions, and which."""
    lines = [*identity(study), *verdict(study), *findings(study.findings, "exception")]
    return "\n".join(lines) + "\n"
