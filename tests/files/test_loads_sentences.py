"""Mistakes in tables of loads name the cell and say what to write in it."""

import openpyxl
import pytest

from relaycfg.errors import InputError

HEAD = "board,name,between,kw\n"
LINES = "L1-N, L2-N, L3-N, L1-L2, L2-L3, L3-L1, L1-L2-L3, L1-L2-L3-N"
COLUMNS = (
    "board, name, between, kw, current_a, ohm, pf, reactive, kind, zip_p, zip_q, band_pu, usage, demand, group, "
    "third_harmonic_percent, minds_low_v, count, evidence"
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
    "neither true nor false": (
        "board,between,kw,minds_low_v\nMB,L1-N,2,maybe\n",
        'loads.csv:2:4 (minds_low_v): minds_low_v is "maybe"; write true or false',
    ),
    "open quote": (HEAD + 'MB,"a,L1-N,2\n', "loads.csv:2: not CSV (unexpected end of data); correct the line"),
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
        "load.csv: not there; did you mean loads.csv?"
    ]


def test_the_caret_of_a_csv_stands_below_its_cell(bench):
    bench.put("loads.csv", HEAD + 'MB,"Saw, large",L1-N,two\n')
    with pytest.raises(InputError) as caught:
        bench.read(bench.site + FILE)
    line, caret = caught.value.text().splitlines()[1:]
    assert line[caret.index("^") :] == "two"


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
        'loads.xlsx: without a sheet Load; did you mean "Loads"?'
    ]


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
