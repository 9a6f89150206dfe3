"""From bytes to tables: one table in every dress, everything broken, and nothing lost silently."""

from __future__ import annotations

import csv
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from backveer.io.readers import layout, text
from backveer.io.readers.cells import numbers
from backveer.io.readers.dialect import Dialect, detect
from backveer.io.readers.errors import NotATable, ReadError
from backveer.io.readers.table import Table
from backveer.io.readers.text import read_tables

DRESS = Path(__file__).parents[2] / "data" / "dress"
FILES = sorted(path.name for path in DRESS.iterdir() if path.suffix != ".md")

NAN = np.nan
LEVELS = {
    "height": [52, 140.5, 331, 610, 948, 1390, 1804],
    "pressure": [1003.2, 992.7, 971.6, 939.6, 901.9, 854.4, 812],
    "temperature": [11.4, 11, NAN, 7.7, 5.2, -2.9, -5.5],
    "speed": [4.5, 8.25, 11.5, 13, 12.75, NAN, 10.5],
    "direction": [231, 238, NAN, 251, 256.5, NAN, 7],
}
METADATA = (
    ("Station", "Harrow Skerry"),
    ("Latitude", "58.41 N"),
    ("Launch", "2031-05-14 23:15 UTC"),
)


@pytest.fixture(autouse=True)
def _forget_headers():
    layout._known.clear()


@pytest.fixture(params=["whole", "large", "in pieces"])
def way(request, monkeypatch):
    """Each of the three ways through a file: plain strings, pyarrow, pieces of a few lines."""
    if request.param != "whole":
        monkeypatch.setattr(text, "LARGE", 60)
    if request.param == "in pieces":
        monkeypatch.setattr(text, "by_arrow", lambda *_: None)
    return request.param


def one(data: bytes | str, **settings: bool) -> Table:
    (table,) = many(data, **settings)
    return table


def many(data: bytes | str, **settings: bool) -> list[Table]:
    raw = data.encode() if isinstance(data, str) else data
    tables = read_tables("night.csv", raw, **settings)
    for table in tables:
        assert {len(column) for column in table.columns} == {len(table.lines)}
        assert len(table.columns) == len(table.header)
        assert len(table.units) in (0, len(table.header))
        assert all(column.dtype in (np.float64, object) for column in table.columns)
        assert table.lines.dtype == np.int64
        assert (np.diff(table.lines) > 0).all()
    return tables


def refusal(data: bytes | str, **settings: bool) -> str:
    with pytest.raises(NotATable) as caught:
        many(data, **settings)
    assert caught.value.source == "night.csv"
    assert "\n" not in str(caught.value)
    return str(caught.value)


def same(table: Table, expected: dict[str, list[float]]) -> None:
    for column, values in zip(table.columns, expected.values(), strict=True):
        np.testing.assert_array_equal(column, values, strict=False)
        assert column.dtype == np.float64


# --- one table in many dresses ---------------------------------------------------------------


@pytest.mark.parametrize("name", FILES)
def test_every_dress_holds_the_same_numbers(name, way):
    table = one((DRESS / name).read_bytes())
    same(table, LEVELS)
    assert [header.split(" (")[0] for header in table.header] == list(LEVELS)
    if table.metadata and name != "logger.csv":
        assert table.metadata[-3:] == METADATA


def test_there_are_twenty_dresses_and_more():
    assert len(FILES) >= 20


@pytest.mark.parametrize("name", FILES)
def test_the_lines_are_those_of_the_file(name):
    raw = (DRESS / name).read_bytes()
    table = one(raw)
    decoded = raw.decode(table.encoding).replace("\r\n", "\n").replace("\r", "\n").split("\n")
    for height, line in zip(LEVELS["height"], table.lines, strict=True):
        said = decoded[line - 1].replace(",", ".").replace('"', " ").strip("\ufeff ")
        assert said.startswith(f"{height:g}")


@pytest.mark.parametrize(
    ("name", "encoding", "delimiter", "decimal"),
    [
        ("comma_utf8_bom.csv", "utf-8-sig", ",", "."),
        ("comma_quoted_decimal_comma.csv", "utf-8", ",", ","),
        ("semicolon_decimal_comma_cp1252.csv", "cp1252", ";", ","),
        ("semicolon_latin1.csv", "latin-1", ";", "."),
        ("tab_decimal_comma_utf16le_bom.txt", "utf-16-le", "\t", ","),
        ("tab_utf16be_bom.txt", "utf-16-be", "\t", "."),
        ("tab_utf16le_no_bom.txt", "utf-16-le", "\t", "."),
        ("aligned_decimal_comma.txt", "utf-8", " ", ","),
        ("fixed_decimal_comma.txt", "utf-8", "", ","),
        ("pipe.txt", "utf-8", "|", "."),
    ],
)
def test_the_dress_is_told(name, encoding, delimiter, decimal):
    table = one((DRESS / name).read_bytes())
    assert (table.encoding, table.delimiter, table.decimal) == (encoding, delimiter, decimal)


@pytest.mark.parametrize(
    ("name", "units"),
    [
        ("semicolon_decimal_comma.csv", ("m", "hPa", "°C", "m/s", "deg")),
        ("aligned.txt", ("[m]", "[hPa]", "[degC]", "[m/s]", "[deg]")),
        ("comments_percent.txt", ("m", "hPa", "degC", "m/s", "deg")),
        ("fixed_left.txt", ("m", "hPa", "degC", "m/s", "deg")),
        ("logger.csv", ("m", "hPa", "degC", "m/s", "deg")),
        ("comma.csv", ()),
    ],
)
def test_a_units_row_is_told(name, units):
    assert one((DRESS / name).read_bytes()).units == units


@pytest.mark.parametrize(
    ("name", "remarks"),
    [
        ("comma.csv", ()),
        ("comma_trailing.csv", ("the delimiter at the end of each line was passed over",)),
        ("repeated_header.csv", ("a repeated header was left out (line 8)",)),
        (
            "ragged.csv",
            (
                "2 rows with more or fewer cells than the header were left out "
                "(the first at line 7)",
            ),
        ),
        (
            "footer.csv",
            ("2 lines of text inside or under the table were left out (the first at line 13)",),
        ),
    ],
)
def test_what_was_left_out_is_told(name, remarks, way):
    assert one((DRESS / name).read_bytes()).remarks == remarks


# --- headers, units, metadata ----------------------------------------------------------------


@pytest.mark.parametrize("units", ["m;m/s;deg", "[m];[m s-1];[deg]", "(gpm);(kt);(deg)", ";kt;°"])
def test_spellings_of_a_units_row(units):
    table = one(f"z;ws;wd\n{units}\n10;4.5;231\n20;5.5;238\n")
    assert table.units == tuple(units.split(";"))
    assert table.lines.tolist() == [3, 4]


def test_units_in_brackets_with_blanks():
    table = one("z ws wd\n[m] [m s-1] [deg]\n10 4.5 231\n20 5.5 238\n")
    assert table.units == ("[m]", "[m s-1]", "[deg]")


def test_units_under_a_header_among_comments():
    table = one("# z ws wd\n# m m/s deg\n10 4.5 231\n20 5.5 238\n")
    assert table.header == ("z", "ws", "wd")
    assert table.units == ("m", "m/s", "deg")


def test_names_that_look_like_units_are_a_header():
    assert one("m;s;K\n10;4.5;231\n20;5.5;238\n").header == ("m", "s", "K")


def test_heights_as_names_are_a_header():
    table = one("time;40;60;80\n2031-05-14 23:10;5,1;6,1;7,1\n2031-05-14 23:20;5,2;6,2;7,2\n")
    assert table.header == ("time", "40", "60", "80")
    assert table.columns[0].tolist() == ["2031-05-14 23:10", "2031-05-14 23:20"]
    assert table.columns[3].tolist() == [7.1, 7.2]


def test_a_quoted_name_may_hold_delimiter_and_line_end(way):
    table = one('z,"speed, mean\n(m/s)",wd\n10,4.5,231\n20,5.5,238\n')
    assert table.header == ("z", "speed, mean (m/s)", "wd")
    assert table.lines.tolist() == [3, 4]


def test_date_and_time_under_one_name():
    table = one("Time ws wd\n2031-05-14 23:10:00 5.5 230\n2031-05-14 23:20:00 6.5 231\n")
    assert table.columns[0].tolist() == ["2031-05-14T23:10:00", "2031-05-14T23:20:00"]


def test_a_fixed_column_without_any_value_keeps_its_place():
    table = one(
        "height  press  rh   speed\n"
        "   52  1003.2        4.5\n"
        "  140   992.7           \n"
        "  331   971.6       11.5\n"
    )
    assert table.header == ("height", "press", "rh", "speed")
    assert np.isnan(table.columns[2]).all()
    np.testing.assert_array_equal(table.columns[3], [4.5, NAN, 11.5])


def test_a_number_that_crosses_the_edge_of_a_fixed_column_is_not_cut():
    rows = [f"{k:6d}  {k / 4:8.2f}  {230 + k:6d}" for k in range(1, 500)]
    rows[5] = rows[5][:8] + " " * 8 + rows[5][16:]
    rows[450] = "   451  12345678901   250"
    table = one("height     speed     dir\n" + "\n".join(rows))
    assert table.delimiter == ""
    assert table.lines.tolist() == [k + 1 for k in range(1, 500) if k != 451]
    assert table.remarks == (
        "a row with more or fewer cells than the header was left out (line 452)",
    )


def test_metadata_keep_their_order_and_what_has_no_key():
    table = one(
        "Ascent of the night\n"
        "Station;Harrow Skerry;;\n"
        "# Lat: 58.41; Lon: -3.05\n"
        "Launch 2031-05-14 23:15 UTC\n"
        "\n"
        "z;ws;wd\n10;4.5;231\n20;5.5;238\n"
    )
    assert table.metadata == (
        ("", "Ascent of the night"),
        ("Station", "Harrow Skerry"),
        ("Lat", "58.41"),
        ("Lon", "-3.05"),
        ("Launch", "2031-05-14 23:15 UTC"),
    )


# --- cells -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "mark",
    [
        *("", "///", "/////", "-", "--", "NaN", "nan", "NAN", "N/A", "NA", "#N/A", "null", "NULL"),
        *("none", "*", "****", "M", "missing", "XXXX"),
    ],
)
def test_textual_missing_marks(mark, way):
    table = one(f"z,ws,wd\n10,4.5,231\n20,{mark},238\n30,5.5,240\n40,6.5,250\n")
    np.testing.assert_array_equal(table.columns[1], [4.5, NAN, 5.5, 6.5])


def test_numeric_codes_and_signs_are_numbers(way):
    table = one("z,ws,t\n10,-999,+1.5\n20,9999,-.5e1\n30,999.9,\u22123.\n")
    assert table.columns[1].tolist() == [-999, 9999, 999.9]
    assert table.columns[2].tolist() == [1.5, -5, -3]


@pytest.mark.parametrize(
    "cell", ["1_000", "ERR", "4.5*", "\u0664", "0x10", "1.2.3", "4,5", "12:30"]
)
def test_a_cell_that_is_no_number_makes_words_of_its_column(cell, way):
    rows = "".join(f'{z},"{cell if z == 30 else z / 4}",231\n' for z in range(10, 100, 10))
    table = one("z,ws,wd\n" + rows)
    assert table.columns[1].dtype == object
    assert table.columns[1][2] == cell
    assert table.columns[1][1] == "5.0"
    values, odd = numbers(table.columns[1], table.decimal)
    assert odd.tolist() == [2]
    assert np.isnan(values[2])
    assert values[1] == 5


def test_with_a_decimal_comma_a_point_is_no_decimal_mark(way):
    rows = "".join(f"{z};{z},5;{'1.013' if z == 30 else '2'}\n" for z in range(10, 100, 10))
    table = one("z;ws;p\n" + rows)
    assert table.decimal == ","
    assert table.columns[2][2] == "1.013"


def test_words_dates_and_times_stay_as_written(way):
    table = one(
        "station,time,z,ws\n"
        + "".join(f"Harrow ,2031-05-14T23:{k:02d}Z, {k},{k / 4}\n" for k in range(10, 30))
    )
    assert table.columns[0].tolist() == ["Harrow"] * 20
    assert table.columns[1][3] == "2031-05-14T23:13Z"
    assert table.columns[2].tolist() == list(range(10, 30))


def test_a_comment_among_rows_of_words_is_no_row(way):
    rows = "".join(f"Harrow,{k},{k / 4}\n" for k in range(10, 30))
    table = one("station,z,ws\n" + rows + "#Harrow,1,2\n" + rows)
    assert len(table.lines) == 40
    assert table.remarks == ("a comment inside or under the table was left out (line 22)",)


# --- several tables --------------------------------------------------------------------------


def test_blocks_with_metadata_of_their_own_are_tables_of_their_own(way):
    first, second = many(
        "Station: Harrow Skerry\nLaunch: 2031-05-14 23:15\nz,ws\nm,m/s\n10,1\n20,2\n30,3\n\n"
        "Launch: 2031-05-15 05:15\nz,ws\nm,m/s\n10,4\n20,5\n\nTotal: 5\n"
    )
    assert first.metadata == (("Station", "Harrow Skerry"), ("Launch", "2031-05-14 23:15"))
    assert second.metadata == (("Station", "Harrow Skerry"), ("Launch", "2031-05-15 05:15"))
    assert first.lines.tolist() == [5, 6, 7]
    assert second.lines.tolist() == [12, 13]
    assert first.columns[1].tolist() == [1, 2, 3]
    assert second.columns[1].tolist() == [4, 5]
    assert first.remarks == ()
    assert second.remarks == ("a line of text inside or under the table was left out (line 15)",)


def test_keys_that_come_again_begin_a_table_without_a_header(way):
    first, second = many(
        "# Launch: A\nz,ws,wd\n10,1,231\n20,2,232\n# Launch: B\n10,3,233\n# a cloud\n20,4,234\n"
    )
    assert (first.metadata, second.metadata) == ((("Launch", "A"),), (("Launch", "B"),))
    assert second.columns[1].tolist() == [3, 4]
    assert second.remarks == ("a comment inside or under the table was left out (line 7)",)


def test_a_remark_in_the_middle_splits_no_profile(way):
    table = one("# Launch: A\nz,ws,wd\n10,1,231\n20,2,232\n# Sensor: heated\n30,3,233\n")
    assert len(table.lines) == 3
    assert table.remarks == ("a comment inside or under the table was left out (line 5)",)


def test_a_second_header_in_another_order_is_obeyed(way):
    first, second = many("z,ws,wd\n10,1,231\n20,2,232\n\nNext\nws,z,wd\n3,30,233\n4,40,234\n")
    assert first.header == ("z", "ws", "wd")
    assert second.header == ("ws", "z", "wd")
    assert first.columns[0].tolist() == [10, 20]
    assert second.columns[1].tolist() == [30, 40]
    assert second.lines.tolist() == [7, 8]
    assert second.metadata == (("", "Next"),)


def test_a_header_with_nothing_under_it_at_the_end(way):
    table = one("z,ws,wd\n10,1,231\n20,2,232\nmin,max,mean\n")
    assert table.lines.tolist() == [2, 3]
    assert table.remarks == ("what stands under the table from line 4 on was left out",)


# --- refusals --------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("data", "words"),
    [
        (b"", "night.csv: is empty. Check that the file was written or fetched to its end."),
        (b"\n \r\n\t\n", "is empty"),
        (b"\xef\xbb\xbf", "is empty"),
        (b"\xff\xfe", "is empty"),
        (b"z,ws,wd", "has a header and no rows of numbers"),
        (b"# Station: Harrow\nz;ws;wd\nm;m/s;deg\n", "has a header and no rows of numbers"),
        (b"height speed direction\n", "has one line and no rows of numbers"),
        (b"a,b,3\nnote\n1,2,z", "has a header and no rows of numbers"),
        (b"Dear reader,\nthis is a letter.\n", "holds no table"),
        (b"4.5\n5.5\n6.5\n", "holds no table"),
        (b"z,ws\n10,1\0\n20,2\n", "is binary"),
        (bytes(range(256)) * 8, "is binary"),
        (b"\x02\x03\x04\x05" * 99, "is binary"),
        (b"%PDF-1.7\n1 0 obj", "is a PDF document"),
        (b"CDF\x01\0\0\0\0", "is a netCDF file"),
        (b"\x89HDF\r\n\x1a\n\0", "is a netCDF-4 or HDF5 file"),
        (b"BUFR\0\0\x7a\x04", "is a BUFR message"),
        (b"IUSK01 ENMI 142300\r\r\nBUFR\0\0\x7a\x04", "is a BUFR message"),
        (b"GRIB\0\0", "is a GRIB message"),
        (b"PAR1\x15\x04", "is a Parquet file"),
        (b"PK\x03\x04", "is a zip archive"),
        (b"\x1f\x8b\x08\0", "compressed twice"),
        (b"\x89PNG\r\n", "is a picture"),
        (b"\xd0\xcf\x11\xe0\xa1\xb1", "is an old office document"),
        (b"  <!DOCTYPE html>\n<html>", "holds an HTML page"),
        (b"<html><body>404</body>", "holds an HTML page"),
        (b"<?xml version='1.0'?><a/>", "holds an XML document"),
        (b'{"height": [1, 2]}', "holds JSON"),
        (b"{}", "holds JSON"),
        (b'[{"z": 1}]', "holds JSON"),
        (b"[[1, 2], [3, 4]]", "holds JSON"),
        (b"\xff\xfea\0b\0\0\xd8a\0", "looks like UTF-16 and is not"),
    ],
)
def test_what_is_no_table_is_named(data, words):
    assert words in refusal(data)


def test_numbers_without_names():
    bare = "10,4.5,231\n20,5.5,238\n30,6.5,240\n"
    message = refusal(bare)
    assert "night.csv, line 1: has no header, the columns are not named" in message
    assert "--column height='column 1'" in message
    table = one(bare, nameless=True)
    assert table.header == ("column 1", "column 2", "column 3")
    assert table.columns[1].tolist() == [4.5, 5.5, 6.5]
    assert one("z,ws,wd\n" + bare, nameless=True).header == ("z", "ws", "wd")


def test_a_header_of_another_length():
    message = refusal("# Lat: 58\nz,ws\n" + "10,4.5,231\n" * 5)
    assert "line 2: the header has 2 names and the rows have 3 cells. Give each" in message


def test_mostly_ragged_rows(way):
    row = "10,4.5,231\n"
    rows = row + ("20,5\n" + "30,5,6,7\n" + "40,5,6,7,8\n") * 4 + row * 8
    message = refusal("z,ws,wd\n" + rows)
    assert "line 3: 12 of 21 rows have more or fewer cells than the header" in message


def test_a_file_cut_within_a_character():
    table = one("z,ws,wo\n10,4.5,a\n20,5.5,b°".encode()[:-1])
    assert table.encoding == "utf-8"
    assert table.columns[0].tolist() == [10, 20]


# --- headers that were met before ------------------------------------------------------------


def test_a_known_header_over_another_decimal_mark():
    one("z;ws;wd\n10;4.5;231\n20;5.5;238\n")
    table = one("z;ws;wd\n10;4,5;231\n20;5,5;238\n")
    assert table.decimal == ","
    assert table.columns[1].tolist() == [4.5, 5.5]


def test_a_known_header_whose_first_rows_hide_the_decimal_mark():
    one("z;ws;wd\n10;4.5;231\n20;5.5;238\n")
    table = one("z;ws;wd\n" + "10;4;231\n" * 5 + "20;5,5;238\n" * 30)
    assert table.decimal == ","
    assert table.columns[1][-1] == 5.5


def test_a_known_header_over_units():
    one("z;ws;wd\n10;4.5;231\n20;5.5;238\n")
    assert one("z;ws;wd\nm;kt;deg\n10;4.5;231\n20;5.5;238\n").units == ("m", "kt", "deg")
    assert one("z;ws;wd\n10;4.5;231\n20;5.5;238\n").units == ()


def test_known_headers_do_not_pile_up():
    for k in range(600):
        one(f"z{k},ws,wd\n10,4.5,231\n20,5.5,238\n")
    assert len(layout._known) <= 256


# --- the dialect scorer ----------------------------------------------------------------------


@pytest.mark.parametrize(
    "name", [name for name in FILES if name.startswith(("comma", "tab.", "semi"))]
)
def test_where_the_sniffer_of_the_standard_library_is_right_we_agree(name):
    raw = (DRESS / name).read_bytes()
    table = one(raw)
    decoded = raw.decode(table.encoding).replace("\r\n", "\n").replace("\r", "\n")
    try:
        sniffed = csv.Sniffer().sniff(decoded, ",;\t|").delimiter
    except csv.Error:
        pytest.skip("the sniffer finds no delimiter")
    if decoded.count(sniffed) < 4 * len(LEVELS["height"]):
        pytest.skip("the sniffer took a mark that does not part five columns")
    rows = [line.count(sniffed) for line in decoded.split("\n")][-5:-1]
    if table.decimal == sniffed or len(set(rows)) > 1:
        pytest.skip("the sniffer took the decimal mark")
    assert table.delimiter == sniffed


@pytest.mark.parametrize(
    ("lines", "dialect"),
    [
        (["100, 5, 230", "200, 6, 231"], Dialect(",", ".")),
        (["100,5 230,7", "200,5 240,7"], Dialect(" ", ",")),
        (["1,5;2,5;3", "4,5;5,5;6"], Dialect(";", ",")),
        (["2031-05-14 23:15,1,2", "2031-05-14 23:25,3,4"], Dialect(",", ".")),
        (["14.05.2031 23:15;1,5;2", "14.05.2031 23:25;3,5;4"], Dialect(";", ",")),
        (['"4,5","231"', '"5,5","238"'], Dialect(",", ",")),
        (["1\t\t3", "4\t5\t"], Dialect("\t", ".")),
    ],
)
def test_dialects_that_could_be_mistaken(lines, dialect):
    found = detect(lines * 3)
    assert found is not None
    assert found.dialect == dialect


# --- any bytes, any numbers ------------------------------------------------------------------


LINE = st.lists(
    st.sampled_from(
        [*"#%!;/,|\t \"'=:-*", "1", "2.5", "3,5", "z", "m/s", "Lat", "NaN", "\r", "12:30"]
    ),
    max_size=9,
).map("".join)


@given(st.one_of(st.binary(max_size=400), st.lists(LINE, max_size=12).map("\n".join)))
@example(b"a,b\n1,2\n" + b'"' * 5)
def test_any_bytes_give_tables_or_a_read_error(data):
    raw = data.encode() if isinstance(data, str) else data
    for nameless in (False, True):
        try:
            tables = many(raw, nameless=nameless)
        except ReadError as error:
            said = str(error)
        else:
            said = tables[0].source
        assert said.startswith("night.csv")


FLOATS = st.floats(allow_nan=False, allow_infinity=False)


@given(
    rows=st.integers(2, 5).flatmap(
        lambda width: st.lists(
            st.lists(FLOATS, min_size=width, max_size=width), min_size=2, max_size=9
        )
    ),
    dress=st.sampled_from(
        [(d, m) for d in (",", ";", "\t", "|", " ", "   ") for m in ".," if (d, m) != (",", ",")]
    ),
    newline=st.sampled_from(["\n", "\r\n", "\r"]),
    encoding=st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "latin-1"]),
    comments=st.booleans(),
)
@pytest.mark.parametrize("large", [False, True])
def test_finite_numbers_come_back_exactly(large, rows, dress, newline, encoding, comments):
    delimiter, decimal = dress
    lines = [delimiter.join(f"name{place}" for place in range(len(rows[0])))]
    lines += [delimiter.join(repr(x).replace(".", decimal) for x in row) for row in rows]
    if comments:
        lines.insert(0, "# Höhe: 5 m" if encoding != "utf-8" else "# Height: 5 m")
    raw = newline.join(lines).encode(encoding)
    with pytest.MonkeyPatch.context() as patch:
        if large:
            patch.setattr(text, "LARGE", 40)
        table = one(raw)
    np.testing.assert_array_equal(np.column_stack(table.columns), np.array(rows))
    assert table.header == tuple(f"name{place}" for place in range(len(rows[0])))


@pytest.mark.parametrize("mark", [*' \t-=(:;,1"#a', "1:", "(1", " 1", "a ", "\u0664 "])
@pytest.mark.parametrize("end", ["", "x", "\nz,ws,wd\n10,4.5,231\n20,5.5,238\n"])
def test_no_long_line_takes_long(mark, end):
    """A pattern that goes over the same text twice would need hours for these, not seconds."""
    for comment in ("", "# "):
        try:
            many(comment + mark * (300_000 // len(mark)) + end)
        except ReadError as error:
            said = error.problem
        else:
            said = ""
        assert len(said) < 200


def test_headers_without_end():
    message = refusal("a,b,c\n1,2,3\nb,a,c\n1,2,3\n" * 2000)
    assert "has more than 100 different headers. Split it into one file a table" in message


def test_a_header_at_once_under_a_header_leads_on():
    bare = "1 2 3\n4 5 6\n" * 4 + "a b c\n\n  z  ws  wd\nz ws wd\n"
    for large in (False, True):
        with pytest.MonkeyPatch.context() as patch:
            if large:
                patch.setattr(text, "LARGE", 20)
            assert many(bare, nameless=True)


READ_AND_MEASURE = """
import resource, sys
import numpy
from backveer.io.readers.files import open_inputs
from backveer.io.readers.text import read_tables

peak = lambda: resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024
before = peak()
(read,) = open_inputs(sys.argv[1:])
(table,) = read_tables(*read)
print(len(table.lines), peak() - before, "pandas" in sys.modules)
"""


@pytest.mark.slow
@pytest.mark.parametrize("odd", ["", "1,2\n"], ids=["regular", "one ragged row"])
def test_a_large_file_needs_less_than_six_times_its_size(tmp_path, odd):
    piece = "".join(
        f"2031-05-14 {k // 60 % 24:02d}:{k % 60:02d},{k / 8:.2f},{k % 397 / 7:.2f},{k % 360}\n"
        for k in range(50_000)
    )
    path = tmp_path / "large.csv"
    path.write_text("time,height,speed,direction\n" + piece * 60 + odd)
    answer = subprocess.run(
        [sys.executable, "-c", READ_AND_MEASURE, str(path)],
        capture_output=True,
        text=True,
        check=True,
    ).stdout.split()
    assert int(answer[0]) == 3_000_000
    assert int(answer[1]) < 6 * path.stat().st_size
    assert answer[2] == "False"


def test_a_preamble_full_of_numbers_does_not_blur_fixed_columns():
    lines = ["lat 48.2 lon 16.4 elev 200 m 2032-03-01 12:00 UTC"]
    lines += [
        "  PRES   HGHT   TEMP   DWPT   DRCT   SKNT",
        "   hPa      m      C      C    deg   knot",
    ]
    for i in range(24):
        dew = f"{9.6 - i / 10:6.1f}" if i % 3 else " " * 6
        wind = f"{225 + i:7d}{9.9 + i:7.1f}" if i % 5 else " " * 14
        lines.append(f"{1005.7 - 5 * i:6.1f}{212 + 44 * i:7d}{13.9 - i / 4:7.1f} {dew}{wind}")
    (table,) = read_tables("a.txt", "\n".join(lines).encode())
    assert table.header == ("PRES", "HGHT", "TEMP", "DWPT", "DRCT", "SKNT")
    assert table.units == ("hPa", "m", "C", "C", "deg", "knot")
    assert [column.dtype.kind for column in table.columns] == ["f"] * 6
    assert table.columns[1][:3].tolist() == [212.0, 256.0, 300.0]
    assert int(np.isnan(table.columns[3]).sum()) == 8
