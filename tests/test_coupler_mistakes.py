"""Mistakes in coupler tables: each found, worded with line and column, and all of them reported at once."""

from pathlib import Path

import pytest
from coupler_tables import LOGIC, PHOTOTRANSISTOR, read_table, write_table
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from optopick.errors import InputError
from optopick.read_couplers import CouplerTable, read_couplers

DEMO = Path(__file__).parents[1] / "catalogs" / "demo.csv"


def mistakes_of(path: Path) -> list[str]:
    with pytest.raises(InputError) as raised:
        read_couplers(path)
    return [str(mistake) for mistake in raised.value.mistakes]


CELLS = [
    ({"part": ""}, "part: found an empty cell; expected part number without its bin"),
    ({"part": "A\tB"}, r'part: found "A\tB"; expected one line of printable text, up to 200 characters'),
    (
        {"sheet": "x" * 201},
        f'sheet: found "{"x" * 57}..."; expected one line of printable text, up to 200 characters',
    ),
    ({"kind": "triac"}, 'kind: found "triac"; expected phototransistor, darlington or logic'),
    ({"base_pin": "maybe"}, 'base_pin: found "maybe"; expected yes or no'),
    ({"channels": "2.5"}, 'channels: found "2.5"; expected a whole number, 1 to 16'),
    ({"channels": "0"}, 'channels: found "0"; expected a whole number, 1 to 16'),
    ({"ctr_min": "abc"}, 'ctr_min: found "abc"; expected a plain number in %, or a ratio such as "50 %"'),
    ({"ctr_min": "0.5"}, 'ctr_min: found "0.5"; expected 4 to 10000 %; a plain number is in %'),
    ({"ctr_min": "50 mA"}, 'ctr_min: found "50 mA"; expected a plain number in %, or a ratio such as "50 %"'),
    ({"i_f_max": "0.06"}, 'i_f_max: found "0.06"; expected 1 to 1000 mA; a plain number is in mA'),
    ({"i_f_max": "60 V"}, 'i_f_max: found "60 V"; expected a plain number in mA, or a current such as "10 mA"'),
    ({"i_f_max": "60 MA"}, 'i_f_max: found "60 MA"; expected 1 to 1000 mA; a plain number is in mA'),
    ({"i_f_max": "nan"}, 'i_f_max: found "nan"; expected a plain number in mA, or a current such as "10 mA"'),
    ({"i_f_max": "1e999"}, 'i_f_max: found "1e999"; expected 1 to 1000 mA; a plain number is in mA'),
    (
        {"v_f_typ": "1,2"},
        'v_f_typ: found "1,2"; expected a plain number in V, or a voltage such as "3.3 V", with a decimal point',
    ),
    ({"v_f_tc": "1.6"}, 'v_f_tc: found "1.6"; expected -6 to 0 mV/K; a plain number is in mV/K'),
    ({"p_led_derate": "-1.3"}, 'p_led_derate: found "-1.3"; expected 0 to 200 mW/K; a plain number is in mW/K'),
    ({"h_fe_typ": "400 V"}, 'h_fe_typ: found "400 V"; expected a plain number'),
    ({"h_fe_typ": "1"}, 'h_fe_typ: found "1"; expected 5 to 1e+06'),
    ({"price": "free"}, 'price: found "free"; expected a plain number'),
    ({"i_ceo_t": "100"}, 'i_ceo_t: found "100"; expected -60 to 45 °C; a plain number is in °C'),
    ({"i_ceo_hot_t": "25"}, 'i_ceo_hot_t: found "25"; expected 50 to 200 °C; a plain number is in °C'),
    ({"sat_r_l": "1900"}, 'sat_r_l: found "1900"; expected 0.05 to 1000 kΩ; a plain number is in kΩ'),
    ({"ctr_loss": "100"}, 'ctr_loss: found "100"; expected 0 to 95 %; a plain number is in %'),
    ({"ctr_curve": "5:1"}, 'ctr_curve: found "5:1"; expected two points or more, such as 1:0.72 5:1'),
    (
        {"ctr_curve": "1:0.7 5=1"},
        'ctr_curve: found "1:0.7 5=1"; expected pairs of numbers such as 1:0.72 with blanks between, not 5=1',
    ),
    (
        {"ctr_curve": "1:0.7 5:1e999"},
        'ctr_curve: found "1:0.7 5:1e999"; expected pairs of numbers such as 1:0.72 with blanks between, not 5:1e999',
    ),
    (
        {"ctr_curve": "1:0.7 5:nan"},
        'ctr_curve: found "1:0.7 5:nan"; expected pairs of numbers such as 1:0.72 with blanks between, not 5:nan',
    ),
    (
        {"ctr_curve": "1:0.7 5:--1"},
        'ctr_curve: found "1:0.7 5:--1"; expected pairs of numbers such as 1:0.72 with blanks between, not 5:--1',
    ),
    ({"ctr_curve": "1:0.7 5:1 5:1"}, 'ctr_curve: found "1:0.7 5:1 5:1"; expected points whose first numbers ascend'),
    ({"ctr_curve": "5:1 1:0.7"}, 'ctr_curve: found "5:1 1:0.7"; expected points whose first numbers ascend'),
    (
        {"ctr_curve": "1:0.7 5:1_0"},
        'ctr_curve: found "1:0.7 5:1_0"; expected pairs of numbers such as 1:0.72 with blanks between, not 5:1_0',
    ),
    (
        {"ctr_temperature": "-273:1 25:1"},
        'ctr_temperature: found "-273:1 25:1"; expected first numbers of -100 to 200 °C',
    ),
    ({"ctr_curve": "1:0.7 5000:1"}, 'ctr_curve: found "1:0.7 5000:1"; expected first numbers of 0.001 to 1000 mA'),
    ({"channels": "17"}, 'channels: found "17"; expected a whole number, 1 to 16'),
    ({"ctr_curve": "1:0 5:1"}, 'ctr_curve: found "1:0 5:1"; expected second numbers above zero'),
    ({"ctr_curve": "0:0.5 5:1"}, 'ctr_curve: found "0:0.5 5:1"; expected first numbers of 0.001 to 1000 mA'),
    (
        {"ctr_curve": "1:1e-9 5:1"},
        'ctr_curve: found "1:1e-9 5:1"; expected second numbers within a factor of a million',
    ),
    (
        {"ctr_curve": "1:1 5:1 10:0.5"},
        "ctr_curve: found an output current that falls while LED current rises; expected current times CTR to rise",
    ),
    (
        {"ctr_curve": "0.5:0.7 2:1"},
        "ctr_curve: found points from 0.5 to 2 mA; expected points on both sides of ctr_at, 5 mA",
    ),
    (
        {"ctr_temperature": "30:1 100:0.6"},
        "ctr_temperature: found points from 30 to 100 °C; expected points on both sides of 25 °C",
    ),
    ({"ctr_max": "80"}, "ctr_max: found 80 %; expected at least ctr_min, 90 %"),
    ({"v_f_typ": "1.5"}, "v_f_max: found 1.4 V; expected at least v_f_typ, 1.5 V"),
    ({"v_f_typ": "", "v_f_min": "1.5"}, "v_f_max: found 1.4 V; expected at least v_f_min, 1.5 V"),
    ({"h_fe_max": "300"}, "h_fe_max: found 300; expected at least h_fe_typ, 400"),
    ({"i_ceo_hot": "0.05"}, "i_ceo_hot: found 0.05 µA; expected at least i_ceo, 100 nA"),
    ({"i_f_max": "4"}, "i_f_max: found 4 mA; expected at least ctr_at, 5 mA"),
    ({"sat_t_off": "20"}, "sat_t_off: found 20 µs; expected more than sat_t_s, 20 µs"),
    ({"working": "6000"}, "withstand: found 5 kV; expected at least working, 6000 V"),
    ({"i_f_on": "5"}, "i_f_on: found a filled cell; expected an empty one: kind phototransistor has no i_f_on"),
]


@pytest.mark.parametrize(("cells", "message"), CELLS)
def test_a_wrong_cell(tmp_path, cells, message):
    assert mistakes_of(write_table(tmp_path, PHOTOTRANSISTOR | cells)) == [f"table.csv line 2, column {message}"]


@pytest.mark.parametrize(
    ("cells", "message"),
    [
        ({"i_f_on": "0.4"}, "i_f_on: found 0.4 mA; expected at least i_f_off, 0.5 mA"),
        ({"i_f_on": "60"}, "i_f_max: found 50 mA; expected at least i_f_on, 60 mA"),
        ({"v_cc_max": "2.7"}, "v_cc_max: found 2.7 V; expected at least v_cc_min, 3 V"),
        ({"ctr_min": "50"}, "ctr_min: found a filled cell; expected an empty one: kind logic has no ctr_min"),
        ({"base_pin": "yes"}, 'base_pin: found "yes"; expected no: a logic output has no base to load'),
    ],
)
def test_a_wrong_cell_of_a_logic_row(tmp_path, cells, message):
    assert mistakes_of(write_table(tmp_path, LOGIC | cells)) == [f"table.csv line 2, column {message}"]


HEADER = "part,kind,i_f_max\n"

FILES = [
    (b"", "t.csv: found no header line; expected a line with the names of the columns"),
    (b"# only a comment\n\n", "t.csv: found no header line; expected a line with the names of the columns"),
    (HEADER.encode(), "t.csv: found no rows; expected one line per part and CTR bin below the header"),
    (b"kind\nlogic\n", "t.csv line 1: found no column part; expected the columns part and kind in every table"),
    (b"part,i_f_max\nA,5\n", "t.csv line 1: found no column kind; expected the columns part and kind in every table"),
    (
        b"part,kind,ctr_mim\nA,,\n",
        't.csv line 1: found column "ctr_mim"; expected a known column, such as ctr_min',
    ),
    (
        b"part,kind,xyzzy\nA,,\n",
        't.csv line 1: found column "xyzzy"; expected a known column; the blank template lists them',
    ),
    (b"part,kind,kind\nA,,\n", 't.csv line 1: found column "kind" 2 times; expected each column once'),
    (b"part,kind,\nA,,5\n", 't.csv line 2: found "5"; expected a column name in the header above it'),
    (
        b"part,kind,i_f_max\nA,logic\n",
        "t.csv line 2: found 2 cells; expected 3 as in the header, with a delimiter for every empty cell",
    ),
    (
        b"part,kind,i_f_max\nA,logic,5,6\n",
        "t.csv line 2: found 4 cells; expected 3 as in the header, with a delimiter for every empty cell",
    ),
    (
        b'part,kind\n\nA,"logic\n',
        "t.csv line 3: found cells that cannot be told apart (unexpected end of data); expected cells with a delimiter "
        "between and quotes closed",
    ),
    (
        b'part,kind\nA,"logic"x\n',
        "t.csv line 2: found cells that cannot be told apart (',' expected after '\"'); expected cells with a "
        "delimiter between and quotes closed",
    ),
    (
        b'part,kind\nA,"' + b"x" * 200_000 + b'"\n',
        "t.csv line 2: found cells that cannot be told apart (field larger than field limit (131072)); expected cells "
        "with a delimiter between and quotes closed",
    ),
    (b"part,kind\n# \xe9\nA,\n", "t.csv line 2: found bytes that are not UTF-8; expected a CSV file in UTF-8"),
    (b"PK\x03\x04\x00\x00", "t.csv: found binary data; expected a CSV file in UTF-8"),
    ("part,kind\n".encode("utf-16"), "t.csv: found binary data; expected a CSV file in UTF-8"),
]


@pytest.mark.parametrize(("data", "message"), FILES)
def test_a_wrong_file(tmp_path, data, message):
    path = tmp_path / "t.csv"
    path.write_bytes(data)
    assert mistakes_of(path) == [message]


def test_a_file_that_is_not_there(tmp_path):
    path = tmp_path / "none.csv"
    assert mistakes_of(path) == [f"{path}: found no such file or directory; expected a CSV file that can be read"]
    assert mistakes_of(tmp_path) == [f"{tmp_path}: found a directory; expected a CSV file that can be read"]


def test_a_part_and_bin_twice(tmp_path):
    rows = [PHOTOTRANSISTOR | {"part": "A", "bin": "B-C"}, PHOTOTRANSISTOR | {"part": "a-B", "bin": "C"}]
    assert mistakes_of(write_table(tmp_path, *rows)) == [
        'table.csv line 3, column part: found "a-B-C"; expected each part and bin once (first on line 2)'
    ]


def test_every_mistake_of_a_file_is_reported_at_once(tmp_path):
    rows = [
        PHOTOTRANSISTOR | {"part": "A", "ctr_min": "abc", "v_ceo": "x", "hue": "red"},
        PHOTOTRANSISTOR | {"part": "B", "ctr_max": "1 %"},
        PHOTOTRANSISTOR | {"part": "C", "ctr_max": "50"},
        PHOTOTRANSISTOR | {"part": "A"},
    ]
    assert [message.split(":")[0] for message in mistakes_of(write_table(tmp_path, *rows))] == [
        "table.csv line 1",
        "table.csv line 2, column ctr_min",
        "table.csv line 2, column v_ceo",
        "table.csv line 3, column ctr_max",
        "table.csv line 4, column ctr_max",
        "table.csv line 5, column part",
    ]


def test_a_range_includes_its_ends(tmp_path):
    for text in ("1", "1000", "1 A"):
        cells = {"i_f_max": text, "ctr_at": "1", "ctr_curve": "0.5:0.6 1:0.75 20:1"}
        assert isinstance(read_table(tmp_path, PHOTOTRANSISTOR | cells), CouplerTable)
    ends = {
        "channels": "16",
        "sheet": "x" * 200,
        "ctr_curve": "0.001:0.01 5:1 1000:10000",
        "ctr_temperature": "-100:1 25:1 200:1",
        "v_f_min": "1.2",
        "v_f_max": "1.2",
    }
    assert isinstance(read_table(tmp_path, PHOTOTRANSISTOR | ends), CouplerTable)
    assert isinstance(read_table(tmp_path, PHOTOTRANSISTOR | {"channels": "1"}), CouplerTable)


# ---- anything at all ------------------------------------------------------------------------------------------------

_DEMO = DEMO.read_bytes()
_WORDS = st.sampled_from(
    ["", "0", "-1", "1e308", "nan", "5:1", "1:1 2:2", "9" * 40, "logic", "darlington", '"', "#", "\0", "²", "1 V"]
)
_PLACES = st.tuples(st.integers(0, 28), st.integers(0, 69))


def _outcome(data: bytes, folder: Path) -> None:
    """Read the data as a table: a table or a list of mistakes, nothing else."""
    path = folder / "fuzzed.csv"
    path.write_bytes(data)
    try:
        table = read_couplers(path)
    except InputError as error:
        assert error.mistakes
    else:
        assert table.couplers or table.set_aside


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("fuzz")


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(changes=st.lists(st.tuples(st.integers(0, len(_DEMO)), st.integers(0, 12), st.binary(max_size=6)), max_size=6))
def test_changed_bytes_never_raise_anything_but_input_error(folder, changes):
    data = _DEMO
    for start, cut, put in changes:
        data = data[:start] + put + data[start + cut :]
    _outcome(data, folder)


@settings(max_examples=300, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(changes=st.dictionaries(_PLACES, _WORDS | st.text(max_size=8), max_size=4))
def test_changed_cells_never_raise_anything_but_input_error(folder, changes):
    lines = [line for line in _DEMO.decode().splitlines() if not line.startswith("#")]
    cells = [line.split(",") for line in lines]
    for (row, column), text in changes.items():
        cells[row % len(cells)][column % len(cells[0])] = text
    _outcome("\n".join(",".join(row) for row in cells).encode("utf-8", "surrogatepass"), folder)


@settings(max_examples=300, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(data=st.data())
def test_believable_numbers_anywhere_give_a_coupler_a_reason_or_a_mistake(folder, data):
    """Numbers within every column's range, and gaps, in the combinations that the rules must survive."""
    row = dict(data.draw(st.sampled_from([PHOTOTRANSISTOR, LOGIC])))
    names = [name for name in row if name not in ("part", "kind")]
    for name in data.draw(st.lists(st.sampled_from(names), max_size=12, unique=True)):
        row[name] = data.draw(st.sampled_from(["", "0.05", "1", "5", "20", "60", "99", "300", "1000", "-2"]))
    _outcome(write_table(folder, row).read_bytes(), folder)
