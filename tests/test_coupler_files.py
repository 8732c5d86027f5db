"""Coupler tables from spreadsheets and Parquet: the same couplers as from CSV, the same mistakes with their place."""

from __future__ import annotations

import csv
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import openpyxl
import pandas as pd
import pytest
from command import ROOT, run
from coupler_tables import DARLINGTON, LOGIC, PHOTOTRANSISTOR, write_table

from optopick.errors import InputError
from optopick.read_couplers import read_couplers

DEMO = ROOT / "catalogs" / "demo.csv"
KINDS = ("xlsx", "parquet")


def number_or_text(cell: str) -> object:
    """A cell as a spreadsheet keeps it once it is typed in."""
    try:
        number = float(cell)
    except ValueError:
        return cell or None
    return int(number) if number.is_integer() else number


def saved(folder: Path, rows: list[list[object]], kind: str, title: str = "Parts") -> Path:
    """Write rows, the header first, to a table of one kind."""
    path = folder / f"table.{kind}"
    if kind == "xlsx":
        book = openpyxl.Workbook()
        book.active.title = title
        for row in rows:
            book.active.append(row)
        book.save(path)
    else:
        header, *body = rows
        pd.DataFrame(body, columns=header).to_parquet(path)
    return path


def rows_of(*rows: dict[str, str]) -> list[list[object]]:
    """Rows under the union of their columns, numbers as numbers where the whole column has them."""
    columns = list(dict.fromkeys(column for row in rows for column in row))
    cells = [[number_or_text(row.get(column, "")) for column in columns] for row in rows]
    for k in range(len(columns)):
        found = [row[k] for row in cells if row[k] is not None]
        if any(isinstance(cell, str) for cell in found):  # Parquet knows no column of two sorts
            for row in cells:
                row[k] = None if row[k] is None else str(row[k])
    return [list(columns), *cells]


def without_rows(path: Path) -> list[object]:
    table = read_couplers(path)
    return [replace(coupler, row=0) for coupler in table.couplers] + [(one.part, one.reason) for one in table.set_aside]


def mistakes_of(path: Path) -> list[str]:
    with pytest.raises(InputError) as refusal:
        read_couplers(path)
    return [str(mistake) for mistake in refusal.value.mistakes]


@pytest.mark.parametrize("kind", KINDS)
def test_the_demo_table_gives_the_same_couplers(tmp_path, kind):
    lines = [line for line in DEMO.read_text(encoding="utf-8").splitlines() if line and not line.startswith("#")]
    path = saved(tmp_path, rows_of(*csv.DictReader(lines)), kind)
    found = without_rows(path)
    assert found == without_rows(DEMO)
    assert len(found) > 60


@pytest.mark.parametrize("kind", KINDS)
def test_rows_are_counted_as_the_file_shows_them(tmp_path, kind):
    path = saved(tmp_path, rows_of(PHOTOTRANSISTOR, DARLINGTON, LOGIC), kind)
    first = 2 if kind == "xlsx" else 1
    assert [coupler.row for coupler in read_couplers(path).couplers] == [first, first + 1, first + 2]


@pytest.mark.parametrize("kind", KINDS)
def test_mistakes_name_sheet_row_and_column(tmp_path, kind):
    rows = rows_of(
        PHOTOTRANSISTOR | {"v_r_max": "900", "part": "A1"}, PHOTOTRANSISTOR | {"part": "a1", "colour": "red"}
    )
    found = mistakes_of(saved(tmp_path, rows, kind))
    header, first, second = {
        "xlsx": ('sheet "Parts" row 1', 'sheet "Parts" row 2', 'sheet "Parts" row 3'),
        "parquet": ("names", "row 1", "row 2"),
    }[kind]
    head = f"table.xlsx {header}" if kind == "xlsx" else "table.parquet, names of the columns"
    assert found[0].startswith(f'{head}: found column "colour"')
    assert found[1].startswith(f'table.{kind} {first}, column v_r_max: found "900"; expected 0.5 to 100 V')
    number = first.rpartition(" ")[2]
    expected = (
        f'table.{kind} {second}, column part: found "a1"; expected each part and bin once (first on row {number})'
    )
    assert found[2] == expected
    assert len(found) == 3


def test_a_csv_table_still_names_its_lines(tmp_path):
    path = write_table(tmp_path, PHOTOTRANSISTOR, PHOTOTRANSISTOR)
    assert mistakes_of(path) == [
        'table.csv line 3, column part: found "VELM1"; expected each part and bin once (first on line 2)'
    ]


@pytest.mark.parametrize("kind", KINDS)
def test_a_table_without_rows(tmp_path, kind):
    where = 'table.xlsx sheet "Parts"' if kind == "xlsx" else "table.parquet"
    path = saved(tmp_path, [["part", "kind"]], kind)
    assert mistakes_of(path) == [f"{where}: found no rows; expected one line per part and CTR bin below the header"]


def test_an_empty_sheet(tmp_path):
    assert mistakes_of(saved(tmp_path, [], "xlsx")) == [
        'table.xlsx sheet "Parts": found no header line; expected a line with the names of the columns'
    ]


class TestSheet:
    def test_the_first_sheet_is_read(self, tmp_path):
        path = saved(tmp_path, rows_of(PHOTOTRANSISTOR), "xlsx")
        book = openpyxl.load_workbook(path)
        book.create_sheet("Notes").append(["part", "part"])
        book.save(path)
        assert len(read_couplers(path).couplers) == 1

    def test_comments_and_empty_rows_are_passed_over_and_counted(self, tmp_path):
        header, row = rows_of(PHOTOTRANSISTOR)
        path = saved(tmp_path, [["# from the sheets of May"], [None, None], header, [None], row], "xlsx")
        assert [coupler.row for coupler in read_couplers(path).couplers] == [5]

    @pytest.mark.parametrize("shown", ["0%", "0.00 %"])
    def test_a_number_shown_in_percent_is_what_is_shown(self, tmp_path, shown):
        """A spreadsheet keeps 90 % as 0.9; taken as it is kept it would be 0.9 %, far below the range believed."""
        path = saved(tmp_path, rows_of(PHOTOTRANSISTOR | {"ctr_min": "0.9"}), "xlsx")
        book = openpyxl.load_workbook(path)
        names = [cell.value for cell in book.active[1]]
        book.active.cell(2, names.index("ctr_min") + 1).number_format = shown
        book.save(path)
        assert read_couplers(path).couplers[0].transfer.ctr_min == pytest.approx(0.9)

    def test_a_truth_value_is_yes_or_no(self, tmp_path):
        for value in (True, False):
            header, row = rows_of(PHOTOTRANSISTOR)
            row[header.index("base_pin")] = value
            assert read_couplers(saved(tmp_path, [header, row], "xlsx")).couplers[0].base_pin is value

    def test_a_number_as_part_keeps_its_digits(self, tmp_path):
        assert (
            read_couplers(saved(tmp_path, rows_of(PHOTOTRANSISTOR | {"part": "817"}), "xlsx")).couplers[0].part == "817"
        )

    def test_a_formula_without_a_value_is_not_an_empty_cell(self, tmp_path):
        header, row = rows_of(PHOTOTRANSISTOR)
        row[header.index("ctr_max")] = "=2*90"
        number = header.index("ctr_max") + 1
        assert mistakes_of(saved(tmp_path, [header, row], "xlsx")) == [
            f'table.xlsx sheet "Parts" row 2, cell {number}: found a formula without a stored value; '
            "expected its value: open the file in the spreadsheet and save it again"
        ]

    def test_an_error_of_the_spreadsheet_is_not_an_empty_cell(self, tmp_path):
        header, row = rows_of(PHOTOTRANSISTOR)
        row[header.index("ctr_max")] = "#DIV/0!"
        assert mistakes_of(saved(tmp_path, [header, row], "xlsx"))[0].startswith(
            'table.xlsx sheet "Parts" row 2, column ctr_max: found "#DIV/0!"'
        )


class TestParquet:
    def test_truth_values_and_an_index_with_a_name(self, tmp_path):
        frame = pd.DataFrame([PHOTOTRANSISTOR, DARLINGTON]).assign(base_pin=[True, False]).set_index("part")
        frame.to_parquet(tmp_path / "table.parquet")
        couplers = read_couplers(tmp_path / "table.parquet").couplers
        assert [(coupler.part, coupler.base_pin) for coupler in couplers] == [("VELM1", True), ("VELM4", False)]

    def test_a_missing_number_is_an_empty_cell(self, tmp_path):
        frame = pd.DataFrame([PHOTOTRANSISTOR, DARLINGTON]).assign(
            c_be=[12.0, None], channels=pd.array([1, None], "Int64")
        )
        frame.to_parquet(tmp_path / "table.parquet")
        first, second = read_couplers(tmp_path / "table.parquet").couplers
        assert first.assumed == ()
        assert {one.parameter for one in second.assumed} == {"c_be", "channels"}


class TestRefused:
    @pytest.mark.parametrize("kind", KINDS)
    def test_no_such_file(self, tmp_path, kind):
        path = tmp_path / f"none.{kind}"
        assert mistakes_of(path) == [
            f"{path}: found no such file or directory; expected a table in .{kind} that can be read"
        ]

    @pytest.mark.parametrize("kind", KINDS)
    def test_a_directory(self, tmp_path, kind):
        path = tmp_path / f"folder.{kind}"
        path.mkdir()
        assert mistakes_of(path) == [f"{path}: found a directory; expected a table in .{kind} that can be read"]

    @pytest.mark.parametrize("kind", KINDS)
    @pytest.mark.parametrize("content", [b"", b"part,kind\n", b"PK\x03\x04 and no more", b"PAR1 and PAR1"])
    def test_another_content(self, tmp_path, kind, content):
        path = tmp_path / f"table.{kind}"
        path.write_bytes(content)
        assert mistakes_of(path) == [
            f"{path}: found no valid .{kind} file; expected a table saved as .{kind}, or as CSV"
        ]

    @pytest.mark.parametrize(("kind", "library"), [("xlsx", "openpyxl"), ("parquet", "pyarrow")])
    def test_a_missing_extra_is_named(self, tmp_path, monkeypatch, kind, library):
        path = saved(tmp_path, rows_of(PHOTOTRANSISTOR), kind)
        for name in [name for name in sys.modules if name.split(".")[0] == library]:
            monkeypatch.delitem(sys.modules, name)
        monkeypatch.setitem(sys.modules, library, None)  # what makes an import fail as if it were not there
        ran = run("table", "check", path)
        assert ran.code == 2
        assert ran.err == (
            f"optopick: {path}: found a .{kind} file, which this installation cannot read; expected "
            f'pip install "optopick[{kind}]", or the table as CSV\n'
        )


def test_a_csv_table_does_not_load_pandas():
    code = f"""
import sys
from pathlib import Path
from optopick.read_couplers import read_couplers
assert read_couplers(Path({str(DEMO)!r})).couplers
assert not {{"pandas", "openpyxl", "pyarrow"}} & sys.modules.keys()
"""
    assert subprocess.run([sys.executable, "-c", code], cwd=ROOT, check=False).returncode == 0
