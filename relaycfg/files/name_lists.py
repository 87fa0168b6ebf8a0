"""Every name a file may use for a published row, as lists for people; what they say is read from the tables."""

from collections.abc import Callable, Iterable

from relaycfg.files.checks import literals
from relaycfg.files.ledger import figure
from relaycfg.files.relay_form import MustHoldForm
from relaycfg.files.resolve_cases import REFERENCE_DIPS, SWELL_SETS
from relaycfg.files.resolve_supply import band_percent
from relaycfg.files.site_form import SourceForm
from relaycfg.files.tables import Row, is_high_curve, shipped


def name_lists() -> str:
    """Markdown: the accepted names of band, kind, curve, class and set, with what they stand for and their source."""
    rows = shipped()
    sets = literals(MustHoldForm.model_fields["sets"].annotation)
    classes = literals(SourceForm.model_fields["class_"].annotation)
    by_name = {row.name: row for row in rows.values() if row.family == "generator"}
    return "\n".join(
        [
            *_list("supply.band", "limits", _named("supply-bands"), _band),
            *_list("load.kind", "[z, i, p] of P; power factor; band", _named("load-kinds"), _kind),
            *_list("equipment.overvoltage", "line to neutral", _named("withstand-curves", is_high_curve), _curve),
            *_list(
                "source.class", "on load steps", [(c, by_name[f"generating set class {c}"]) for c in classes], _steps
            ),
            *_list("must_hold.sets", "disturbances", [(s, rows[REFERENCE_DIPS[s]]) for s in sets], _dips),
        ]
    )


def _named(family: str, keep: Callable[[Row], bool] = lambda _: True) -> list[tuple[str, Row]]:
    return [
        (row.name, row) for row in shipped().values() if row.family == family and "name" in row.content and keep(row)
    ]


def _list(key: str, what: str, named: Iterable[tuple[str, Row]], say: Callable[[str, Row], str]) -> list[str]:
    lines = [f"### {key}", "", f"| name | {what} | source |", "|---|---|---|"]
    for name, row in named:
        names = " or ".join(f"`{n}`" for n in (name, *row.content.get("also", ())))
        lines.append(f"| {names} | {say(name, row)} | {row.cited} |")
    return [*lines, ""]


def _band(_: str, row: Row) -> str:
    low, high = band_percent(row)
    return f"{low:.1f} to +{high:.1f} % of {figure(row.values['nominal_v'])} V"


def _kind(_: str, row: Row) -> str:
    shares = ", ".join(figure(s) for s in row.values["zip_p"])
    pf = f"{figure(row.values['pf'])}" if "pf" in row.values else "none"
    low, high = row.content["band_pu"]
    return f"[{shares}]; {pf}; {figure(low)} to {figure(high)} pu"


def _curve(_: str, row: Row) -> str:
    unit = "V" if "sustained_v" in row.content else "%"
    sustained = row.content.get("sustained_v", row.content.get("sustained_percent"))
    steps = ", ".join(f"{figure(at)} {unit} {figure(s)} s" for at, s in row.points)
    return f"up to {figure(float(sustained or 0))} {unit} for ever, from {steps}"


def _steps(_: str, row: Row) -> str:
    v = row.values
    return f"{figure(v['dip_percent'])} %, +{figure(v['rise_percent'])} %, recovered within {figure(v['recovery_s'])} s"


def _dips(name: str, row: Row) -> str:
    steps = ", ".join(f"{figure(percent)} % for {figure(cycles)}" for percent, cycles, _ in row.points)
    dips = f"dips to {steps} cycles of 50 Hz"
    if name not in SWELL_SETS:
        return dips
    hold = shipped()["household-overvoltage-hold-times"]
    swells = ", ".join(f"{figure(at)} V for {figure(s)} s" for at, s in hold.points)
    return f"{dips}; swells of our own choice at 230 V: {swells} ({hold.cited})"
