"""Derived settings as terminal text, and the comments that go into the settings file."""

from relaycfg.model.results import Study
from relaycfg.text.after_break import after_break
from relaycfg.text.after_trip import after_trip
from relaycfg.text.earthing import earth_reference, touch
from relaycfg.text.findings import blind_spots, coverage, failing_cases, findings
from relaycfg.text.joints import loose_joints
from relaycfg.text.places import seen_by, together
from relaycfg.text.stages import bounds, identity, margins, reasons, settings_table, verdict


def derive_text(study: Study) -> str:
    """Settings first, what is wrong with them next, then why they are so and what they do not see."""
    lines = [*identity(study), *verdict(study), *settings_table(study)]
    lines += findings(study.findings, "exception")
    lines += reasons(study.stages) + bounds(study.stages) + margins(study.stages)
    lines += [*blind_spots(study), *seen_by(study), *coverage(study), *together(study)]
    lines += [*loose_joints(study), *touch(study), *earth_reference(study)]
    lines += after_break(study)
    lines += after_trip(study)
    lines += failing_cases(study.cases)
    lines += findings(study.findings, "warning", "note")
    return "\n".join(lines) + "\n"


def settings_comments(study: Study) -> dict[str, str]:
    """The reason of each stage, by its label, to stand above it in the settings file."""
    return {result.stage.label: result.reason for result in study.stages if result.reason}
