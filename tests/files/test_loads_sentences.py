"""Mistakes in tables of loads name the cell and say what to write in it."""

import openpyxl
import pytest

from relaycfg.errors import InputError

HEAD = "board,name,between,kw\n"
LINES = "L1-N, L2-N, L3-N, L1-L2, L2-L3, L3-L1, L1-L2-L3, L1-L2-L3-N"
COLUMNS = (
    "board, name, between, kw, current_a, ohm, pf, reactive, kind, zip_p, zip_q, band_pu, usage, demand, group, "
    "third_harmonic_percent, minds_low_v, cutout_pu, restart_s, damage_pu, "
    "count, evidence"
)
CSV = {
    "empty": ("", "loads.csv: empty; give a line of column names, then a line a load"),
    "only comments": ("# a\n\n", "loads.csv: empty; give a line of column names, then a line a load"),
    "no loads": (HEAD, "loads.csv:1: without loads; give a line a load"),
    "semicolons": (
        "board;name;between;kw\nMB;a;L1-N;2,4\n",
        "loads.csv:1:1 (board): board is followed by semicolons; separate cells by commas, decimals by points",
    ),
    "decimal comma in quotes": (
        HEAD + 'MB,a,L1-N,"2,4"\n', 'loads.csv:2:4 (kw): kw is "2,4"; write 2.4 with a decimal point'
    ),
    "decimal comma": (
        HEAD + "MB,a,L1-N,2,4\n",
        "loads.csv:2:4 (kw): kw is in a line of 5 cells under 4 column names; "
        "write decimals with a point and put text with commas in quotes",
    ),
    "not a number": (HEAD + "MB,a,L1-N,NaN\n", 'loads.csv:2:4 (kw): kw is "NaN"; write a number in kW'),
    "infinite": (HEAD + "MB,a,L1-N,inf\n", 'loads.csv:2:4 (kw): kw is "inf"; write a number in kW'),
    "huge": (HEAD + "MB,a,L1-N,1e308\n", "loads.csv:2:4 (kw): kw is 1e+308; give kW, -10000 to 10000"),
    "unknown board": (
        HEAD + "# note\nMD,a,L1-N,2\n",
        'loads.csv:3:1 (board): board is "MD", an unknown board; give one of "MB", "Workshop"',
    ),
    "no fourth line": (
        HEAD + "MB,a,L4-N,2\n",
        f'loads.csv:2:3 (between): between is "L4-N"; lines are L1, L2, L3; give one of {LINES}',
    ),
    "same name": (
        HEAD + "MB,a,L1-N,2\nMB, a ,L2-N,2\n",
        'loads.csv:3:2 (name): name is "a", used before; give every load a name of its own',
    ),
    "short line": (HEAD + "MB,a,L1-N\n", "loads.csv:2:4 (kw): kw is missing; give one of kw, current_a, ohm"),
    "unknown column": (
        "bord,name,between,kw\nMB,a,L1-N,2\n", "loads.csv:1:1 (bord): bord is not a known column; did you mean board?"
    ),
    "foreign column": (
        "board,between,kw,colour\nMB,L1-N,2,red\n",
        f"loads.csv:1:4 (colour): colour is not a known column; columns are {COLUMNS}",
    ),
    "column twice": (
        "board,between,kw,kw\nMB,L1-N,2,2\n", "loads.csv:1:4 (kw): kw is a column given twice; remove one"
    ),
    "no board column": ("name,between,kw\na,L1-N,2\n", "loads.csv:1:1 (board): board is missing; add this column"),
    "unknown evidence": (
        "board,between,kw,evidence\nMB,L1-N,2,measurd\n",
        'loads.csv:2:4 (evidence): evidence is "measurd"; did you mean "measured"?',
    ),
    "count of half": (
        "board,between,kw,count\nMB,L1-N,2,1.5\n",
        "loads.csv:2:4 (count): count is 1.5; give a whole number, 1 to 10000"
    ),
    "too large for a number": (
        HEAD + "MB,a,L1-N,1e999\n", 'loads.csv:2:4 (kw): kw is "1e999"; write a number in kW'
    ),
    "bare numbers with a comma": (
        'board,between,ohm\nMB,L1-N,"10, 2"\n',
        'loads.csv:2:3 (ohm): ohm is "10, 2"; write two numbers, such as 10 2',
    ),
    "one number of two": (
        "board,between,ohm\nMB,L1-N,[10]\n", 'loads.csv:2:3 (ohm): ohm is "[10]"; write two numbers, such as 10 2'
    ),
    "two shares of three": (
        "board,between,kw,zip_p\nMB,L1-N,1,0.5 0.5\n",
        'loads.csv:2:4 (zip_p): zip_p is "0.5 0.5"; write three numbers, such as 0.5 0.3 0.2',
    ),
    "a list without quotes": (
        "board,between,ohm\nMB,L1-N,[10, 2]\n",
        "loads.csv:2:3 (ohm): ohm is in a line of 4 cells under 3 column names; write two numbers, such as 10 2",
    ),
    "text behind quotes": (
        HEAD + 'MB,"a"b,L1-N,2\n', "loads.csv:2: not CSV (text behind a closing quote); correct the line"
    ),
    "a character that turns the writing round": (
        HEAD + "MB,a\u202eb,L1-N,2\n",
        'loads.csv:2:2 (name): name is "a\\u202eb", with the control character U+202E right-to-left override; '
        "write plain text",
    ),
    "an unknown kind": (
        "board,between,kw,kind\nMB,L1-N,2,induction furnace\n",
        'loads.csv:2:4 (kind): kind is "induction furnace"; give one of "resistive heater", "lighting mix", '
        '"air conditioner", "refrigerator", "fan", "pump", "washing machine", "range", "dryer", '
        '"water heater", "dishwasher", "heat-pump water heater", ...',
    ),
    "UTF-16 without a mark": (
        HEAD.encode("utf-16-le"), "loads.csv:1:2: not UTF-8 text; save the file as UTF-8"
    ),
    "a spreadsheet by the name of a CSV": (
        b"PK\x03\x04 and more",
        "loads.csv: a spreadsheet (.xlsx), not a CSV file; name it loads.xlsx, or save it as CSV",
    ),
    "an old spreadsheet": (
        b"\xd0\xcf\x11\xe0 and more",
        "loads.csv: a spreadsheet of the old kind (.xls), not a CSV file; save it as .xlsx or CSV",
    ),
    "neither true nor false": (
        "board,between,kw,minds_low_v\nMB,L1-N,2,maybe\n",
        'loads.csv:2:4 (minds_low_v): minds_low_v is "maybe"; write true or false',
    ),
    "open quote": (HEAD + 'MB,"a,L1-N,2\n', "loads.csv:2: not CSV (a quote that is not closed); correct the line"),
    "endless line": (
        HEAD + "x" * 1_000_000, "loads.csv:2:1: a line of 1000000 characters; write at most 10000 in a line"
    ),
}  # fmt: skip
FILE = '[loads]\nfile = "loads.csv"\n'


@pytest.mark.parametrize("name", CSV)
def test_a_mistake_in_a_csv_is_answered_word_for_word(bench, name):
    content, sentence = CSV[name]
    bench.put("loads.csv", content)
    assert bench.sentences(bench.site + FILE) == [sentence]


def test_a_csv_in_another_encoding_says_where_it_begins(bench):
    bench.put("loads.csv", (HEAD + "MB,Öfen,L1-N,2\n").encode("latin-1"))
    assert bench.sentences(bench.site + FILE) == ["loads.csv:2:4: not UTF-8 text; save the file as UTF-8"]


def test_a_missing_loads_file_offers_its_neighbour(bench):
    bench.put("loads.csv", HEAD)
    assert bench.sentences(bench.site + '[loads]\nfile = "load.csv"\n') == [
        'site.toml:31:1: loads.file is "load.csv", not there; did you mean "loads.csv"?'
    ]


def test_the_caret_of_a_csv_stands_below_its_cell(bench):
    bench.put("loads.csv", HEAD + 'MB,"Saw, large",L1-N,two\n')
    with pytest.raises(InputError) as caught:
        bench.read(bench.site + FILE)
    line, caret = caught.value.text().splitlines()[1:]
    assert line[caret.index("^") :] == "two"


def test_line_ends_of_any_kind_are_read_alike(bench):
    text = HEAD + '# note\nMB,"a, b",L1-N,2\nMB,c,L2-N,3\n'
    read = []
    for ends in ("\n", "\r\n", "\r"):
        bench.put("loads.csv", text.replace("\n", ends))
        read.append(bench.read(bench.site + FILE).loads)
    assert read[0] == read[1] == read[2]
    assert [load.name for load in read[0]] == ["a, b", "c", "Kiln"]


@pytest.mark.parametrize("cell", ["10 2", '"[10, 2]"', '"[10,2]"', "[10 2]", "10;2"])
def test_lists_are_read_as_in_toml_or_apart_by_blanks(bench, cell):
    bench.put("loads.csv", f"board,between,ohm\nMB,L1-N,{cell}\n")
    load = bench.read(bench.site + FILE).loads[0]
    assert complex(load.p_w, load.q_var) == pytest.approx(230**2 / complex(10, -2))


def workbook(rows):
    book = openpyxl.Workbook()
    for row in rows:
        book.active.append(row)
    book.active.title = "Loads"
    book.save("loads.xlsx")


def test_mistakes_in_a_spreadsheet_name_sheet_and_cell(bench):
    workbook(
        [
            ["board", "name", "between", "kw"],
            ["MB", "a", "L1-N", "=1+2"],
            ["MB", "=A1", "L1-N", "2,5"],
            ["MB", "b", "L7", 3],
        ]
    )
    assert bench.sentences(bench.site + '[loads]\nfile = "loads.xlsx"\n') == [
        "loads.xlsx Loads!D2: kw is a formula; write its value",
        "loads.xlsx Loads!B3: name is a formula; write its value",
        'loads.xlsx Loads!D3: kw is "2,5"; write 2.5 with a decimal point',
        f'loads.xlsx Loads!C4: between is "L7"; lines are L1, L2, L3; give one of {LINES}',
    ]


def test_a_file_that_only_pretends_to_be_a_spreadsheet_is_refused(bench):
    bench.put("loads.xlsx", b"PK not really")
    assert bench.sentences(bench.site + '[loads]\nfile = "loads.xlsx"\n') == [
        "loads.xlsx: not a readable .xlsx file; save it again as .xlsx or CSV"
    ]


def test_an_unknown_sheet_is_answered_with_those_there_are(bench):
    workbook([["board", "between", "kw"], ["MB", "L1-N", 2]])
    assert bench.sentences(bench.site + '[loads]\nfile = "loads.xlsx"\nsheet = "Load"\n') == [
        'site.toml:32:1: loads.sheet is "Load", no sheet of loads.xlsx; did you mean "Loads"?'
    ]


@pytest.mark.parametrize(
    ("rows", "sentence"),
    [
        (
            [["board", "between", "kw"], ["MB", "L1-N", 2, None, "seen"]],
            "loads.xlsx Loads!E2: a cell without a column name; name its column in line 1, or remove the cell",
        ),
        ([["board", "between", "kw"]], "loads.xlsx Loads: without loads; give a line a load"),
        ([], "loads.xlsx Loads: empty; give a line of column names, then a line a load"),
        (
            [["board", "between", "ohm"], ["MB", "L1-N", 10]],
            'loads.xlsx Loads!C2: ohm is "10"; write two numbers, such as 10 2',
        ),
    ],
)
def test_a_spreadsheet_is_spoken_of_as_one(bench, rows, sentence):
    workbook(rows)
    assert bench.sentences(bench.site + '[loads]\nfile = "loads.xlsx"\n') == [sentence]


def test_csv_and_spreadsheet_give_the_same_loads(bench):
    bench.put("loads.csv", "board,name,between,kw,zip_p,count,minds_low_v\nMB,12,L1-N,2.5,0.5 0.3 0.2,3,yes\n")
    workbook(
        [
            ["board", "name", "between", "kw", "zip_p", "count", "minds_low_v"],
            ["MB", 12, "L1-N", 2.5, "0.5 0.3 0.2", 3.0, True],
        ]
    )
    from_csv = bench.read(bench.site + FILE)
    from_sheet = bench.read(bench.site + '[loads]\nfile = "loads.xlsx"\n')
    assert from_csv.loads == from_sheet.loads
    assert from_csv.loads[0].p_w == 7500
    assert from_csv.loads[0].name == "12"
