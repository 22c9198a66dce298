"""Delimited text: what stands in a file comes out as it stood, and faults name their line."""

from __future__ import annotations

import csv
import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tscale.errors import DataFileError, InvalidInput
from tscale.files import DelimitedReader
from tscale.files.delimited import delimiter_of, encode_row


def lines(text: str) -> io.StringIO:
    return io.StringIO(text, newline="")


def copied(text: str, rows: int = 2, **options: str) -> str:
    reader = DelimitedReader(lines(text), "t.csv", **options)
    out = "".join(line + reader.newline for line in [*reader.preamble, reader.header_text])
    for block in reader.blocks(rows):
        out += block.merged([""] * len(block), reader.newline)
    return out


@pytest.mark.parametrize(
    "text",
    [
        '# top\n\nt,x\n1,2\n# inside, "quote\n\n3,4\n5,6\n# end\n',
        't,x\r\n1,"a,b"\r\n2,"two\r\nlines"\r\n3," ""q"" "\r\n',
        't\n"# no comment"\n"multi\n# no comment either\nline"\n',
        "t,x\n",
    ],
)
@pytest.mark.parametrize("rows", [1, 2, 100])
def test_text_is_kept(text: str, rows: int) -> None:
    assert copied(text, rows) == text


def test_last_line_end_may_lack_and_a_mark_of_order_is_dropped() -> None:
    assert copied("\ufefft,x\n1,2") == "t,x\n1,2\n"


def test_column_lines_and_endings() -> None:
    text = 'a,t\n# c\n"1\n1",x\n2,y\n'
    reader = DelimitedReader(lines(text), "t.csv", column="t")
    (block,) = reader.blocks(10)
    assert block.column == ["x", "y"]
    assert block.lines == [3, 5]  # a row is where it begins
    assert block.merged([",X", ",Y"], "\n") == '# c\n"1\n1",x,X\n2,y,Y\n'


@pytest.mark.parametrize(
    ("text", "column", "row", "words"),
    [
        ("", None, None, "empty"),
        ("# only\n\n", None, None, "empty"),
        ("a,b\n1,2\n", "c", 1, "no column called 'c'"),
        ("a,a\n1,2\n", "a", 1, "2 columns called 'a'"),
        ("a,b\n1,2\n3\n", None, 3, "1 field, the header has 2"),
        ("a,b\n1,2\n3,4,5\n", None, 3, "3 fields"),
        ('a,b\n1,2\n3,"4\n5,6\n', None, 3, "cannot be read"),
        ('a,b\n1,"2"x\n', None, 2, "cannot be read"),
    ],
)
def test_faults_name_their_line(text: str, column: str | None, row: int | None, words: str) -> None:
    with pytest.raises(DataFileError, match=words) as caught:
        for _ in DelimitedReader(lines(text), "t.csv", column=column).blocks(10):
            pass
    assert str(caught.value.path) == "t.csv"
    assert caught.value.row == row


def test_not_utf8() -> None:
    stream = io.TextIOWrapper(io.BytesIO(b"a,b\n1,\xff\n"), encoding="utf-8", newline="")
    with pytest.raises(DataFileError, match="UTF-8"):
        DelimitedReader(stream, "t.csv")


def test_delimiters() -> None:
    assert [delimiter_of(text) for text in (",", "tab", "semicolon", ";")] == [",", "\t", ";", ";"]
    for text in ("", "ab", "x", '"', "#", "\n"):
        with pytest.raises(InvalidInput):
            delimiter_of(text)
    reader = DelimitedReader(lines("a;b\n1,5;2\n"), "t.csv", column="a", delimiter=";")
    assert next(reader.blocks(5)).column == ["1,5"]


@given(st.lists(st.text(alphabet='ab ,;"\r\n', max_size=6), min_size=2, max_size=4))
def test_encoding_is_what_the_standard_library_reads(fields: list[str]) -> None:
    assert next(csv.reader(io.StringIO(encode_row(fields), newline=""), strict=True)) == fields
