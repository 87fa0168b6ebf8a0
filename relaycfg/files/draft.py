"""A site as written: every table checked on its own, before anything is compared or computed."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Generic, TypeVar

from relaycfg.errors import Problem
from relaycfg.files.checks import fill, shown
from relaycfg.files.keys import Form
from relaycfg.files.load_form import FaultForm, LoadForm, LoadsForm, MotorForm
from relaycfg.files.loads import LoadRow, read_loads
from relaycfg.files.positions import Loc
from relaycfg.files.relay_form import CaseForm, EquipmentForm, MustHoldForm, RelayForm
from relaycfg.files.site_form import BoardForm, DocumentForm, EvidenceForm, SiteForm, SourceForm, SupplyForm
from relaycfg.files.tables import tidy
from relaycfg.files.text import TomlFile, choose, near

AForm = TypeVar("AForm", bound=Form)


@dataclass(frozen=True)
class Entry(Generic[AForm]):
    """One element of an array of tables and the place it stands at."""

    loc: Loc
    form: AForm


@dataclass
class Draft:
    """The tables of a site that hold on their own, and the problems of those that do not."""

    file: TomlFile
    folder: Path
    problems: list[Problem]
    document: DocumentForm | None = None
    supply: SupplyForm | None = None
    loads_file: LoadsForm | None = None
    equipment: EquipmentForm | None = None
    must_hold: MustHoldForm | None = None
    sources: list[Entry[SourceForm]] = field(default_factory=list)
    boards: list[Entry[BoardForm]] = field(default_factory=list)
    loads: list[Entry[LoadForm]] = field(default_factory=list)
    motors: list[Entry[MotorForm]] = field(default_factory=list)
    faults: list[Entry[FaultForm]] = field(default_factory=list)
    relays: list[Entry[RelayForm]] = field(default_factory=list)
    cases: list[Entry[CaseForm]] = field(default_factory=list)
    evidence: list[Entry[EvidenceForm]] = field(default_factory=list)
    table_loads: list[LoadRow] = field(default_factory=list)
    meant: frozenset[str] = frozenset()
    """Tables that stand in the file under a misspelt name."""

    def __post_init__(self) -> None:
        self.raw_boards = self._raw_boards()
        names = [_text_at(b, "name") for b in self.raw_boards]
        self.board_names = tuple(dict.fromkeys(n for n in names if n is not None))
        """Names of all boards, those with faults elsewhere included."""
        self.boards_known = bool(names) and len(self.board_names) == len(names)
        """Whether every board has a name of its own, so that a name that is not among them is a mistake."""

    def _raw_boards(self) -> tuple[Any, ...]:
        """Boards as written, whether they hold on their own or not."""
        boards = self.file.data.get("board")
        return tuple(boards) if isinstance(boards, list) else ()

    @property
    def feeders(self) -> dict[str, str]:
        """What feeds every board that says so, by its name; the first of two of one name."""
        fed = [(_text_at(b, "name"), _text_at(b, "fed_from")) for b in reversed(self.raw_boards)]
        return {name: feeder for name, feeder in fed if name is not None and feeder is not None}

    def lacks(self, *tables: str) -> bool:
        """Whether none of those tables is given, not even under a misspelt name."""
        return not any(name in self.file.data or name in self.meant for name in tables)

    def problem(self, loc: Loc, given: str, remedy: str, allowed: str = "") -> Problem:
        """A problem at a place of the site file."""
        return self.file.problem(loc, given, remedy, allowed)

    def add(self, loc: Loc, given: str, remedy: str, allowed: str = "") -> None:
        """Notes a problem at a place of the site file."""
        self.problems.append(self.problem(loc, given, remedy, allowed))


def _text_at(table: Any, key: str) -> str | None:
    value = table.get(key) if isinstance(table, Mapping) else None
    return tidy(value) if isinstance(value, str) else None


def draft_site(file: TomlFile, folder: Path) -> Draft:
    """Checks every table of the file, and the loads file it names."""
    known = [info.alias or name for name, info in SiteForm.model_fields.items()]
    unknown = {name: near(name, known) for name in file.data if name not in known}
    draft = Draft(file, folder, [], meant=frozenset(match for match in unknown.values() if match))
    for name, match in unknown.items():
        draft.add((name,), "not a known table", f"did you mean {match}?" if match else choose(name, known))
    draft.document = _table(draft, "document", DocumentForm)
    draft.supply = _table(draft, "supply", SupplyForm, needed=True)
    draft.equipment = _table(draft, "equipment", EquipmentForm)
    draft.must_hold = _table(draft, "must_hold", MustHoldForm)
    draft.sources = _array(draft, "source", SourceForm, needed=True)
    draft.boards = _array(draft, "board", BoardForm, needed=True)
    draft.loads = _array(draft, "load", LoadForm)
    draft.motors = _array(draft, "motor", MotorForm)
    draft.faults = _array(draft, "fault", FaultForm)
    draft.relays = _array(draft, "relay", RelayForm)
    draft.cases = _array(draft, "case", CaseForm)
    draft.evidence = _array(draft, "evidence", EvidenceForm)
    if "loads" in file.data:
        draft.loads_file = _table(draft, "loads", LoadsForm)
        if draft.loads_file is not None:
            named, sheet = draft.loads_file.file, draft.loads_file.sheet
            path = folder / named
            draft.table_loads = read_loads(path, str(path), sheet, draft.problems, (named, draft.problem))
    return draft


def _table(draft: Draft, name: str, form: type[AForm], needed: bool = False) -> AForm | None:
    data: Any = draft.file.data.get(name)
    if data is None and needed:
        if draft.lacks(name):
            draft.add((name,), "missing", f"write a [{name}] table")
        return None
    if isinstance(data, list):
        draft.add((name,), "given more than once", f"write one [{name}] table")
        return None
    return fill(form, {} if data is None else data, draft.file, (name,), draft.problems)


def _array(draft: Draft, name: str, form: type[AForm], needed: bool = False) -> list[Entry[AForm]]:
    data: Any = draft.file.data.get(name)
    if data is None or data == []:
        if needed and name not in draft.meant:
            draft.add((name,), "missing", f"write a [[{name}]] table")
        return []
    if not isinstance(data, list):
        given = "one table" if isinstance(data, Mapping) else shown(data)
        draft.add((name,), given, f"write [[{name}]] in double brackets")
        return []
    entries = []
    for index, element in enumerate(data):
        filled = fill(form, element, draft.file, (name, index), draft.problems)
        if filled is not None:
            entries.append(Entry((name, index), filled))
    return entries


@dataclass(frozen=True)
class PlacedLoad:
    """A load with its name, its evidence tag and a way to point at its keys."""

    form: LoadForm
    name: str
    evidence: str
    loc: Loc | None
    row: LoadRow | None

    def add(self, draft: Draft, column: str, given: str, remedy: str, allowed: str = "") -> None:
        """A problem of one of its keys, in the site or in the loads file."""
        if self.row is not None:
            draft.problems.append(self.row.at(column).problem(given, remedy, allowed))
        elif self.loc is not None:
            draft.add((*self.loc, column), given, remedy, allowed)


def placed_loads(draft: Draft) -> list[PlacedLoad]:
    """All loads, those of the file first; nameless ones are called by their number."""
    loads: list[PlacedLoad] = []
    for row in draft.table_loads:
        loads.append(PlacedLoad(row.form, row.form.name or f"load {len(loads) + 1}", row.evidence, None, row))
    for entry in draft.loads:
        loads.append(PlacedLoad(entry.form, entry.form.name or f"load {len(loads) + 1}", "", entry.loc, None))
    return loads
