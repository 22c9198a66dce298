"""Lines of a stream that is still being written."""

from __future__ import annotations

import io
import os

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tscale.files import DelimitedReader, LiveLines


class Pieces(io.RawIOBase):
    """A stream in memory that gives one piece at a time."""

    def __init__(self, pieces: list[bytes]) -> None:
        self.pieces = [piece for piece in pieces if piece]

    def read1(self, size: int = -1) -> bytes:
        return self.pieces.pop(0) if self.pieces else b""


@given(st.lists(st.text(alphabet="aé\r\n,", max_size=5)), st.integers(1, 4))
def test_lines_are_those_of_a_file(texts: list[str], width: int) -> None:
    content = "".join(texts).encode()
    pieces = [content[i : i + width] for i in range(0, len(content), width)]
    whole = io.TextIOWrapper(io.BytesIO(content), encoding="utf-8", newline="")
    assert list(LiveLines(Pieces(pieces))) == list(whole)


def test_bytes_that_are_no_utf8_stay_apart() -> None:
    assert list(LiveLines(Pieces([b"a\xff\n", b"\xc3", b"\xa9"]))) == ["a\udcff\n", "é"]


@pytest.mark.skipif(os.name != "posix", reason="pipes are asked with select")
def test_ready_says_whether_a_line_can_be_had() -> None:
    source, sink = os.pipe()
    with os.fdopen(source, "rb") as stream:
        lines = LiveLines(stream)
        assert not lines.ready()
        os.write(sink, b"half")
        assert not lines.ready()
        os.write(sink, b" a line\nnext")
        assert lines.ready()
        assert next(lines) == "half a line\n"
        assert not lines.ready()
        os.close(sink)
        assert lines.ready()
        assert list(lines) == ["next"]
        assert lines.ready()  # the end is known


@pytest.mark.skipif(os.name != "posix", reason="pipes are asked with select")
def test_blocks_end_where_the_writer_waits() -> None:
    source, sink = os.pipe()
    with os.fdopen(source, "rb") as stream:
        lines = LiveLines(stream)
        os.write(sink, b"t\n1\n2\n3\n")
        blocks = DelimitedReader(lines, "pipe").blocks(100, lines.ready)
        assert next(blocks).column == ["1", "2", "3"]
        os.write(sink, b"# said between\n4\n")
        block = next(blocks)
        assert block.column == ["4"]
        assert block.aside == [(0, "# said between")]
        assert block.lines == [6]
        os.close(sink)
        assert list(blocks) == []
