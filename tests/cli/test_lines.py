"""Lines with their own endings, whatever the cuts between reads, in time and memory that the longest line bounds."""

from __future__ import annotations

import io
import re
import time
from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.cli.streams import LONGEST_LINE, ReadFailed, iter_lines
from gcodetool.errors import Refusal

PROGRAMS = st.lists(st.sampled_from([b"\r", b"\n", b"\r\n", b"G1", b" X\xe9\x00", b"\x0b\x0c\x85"])).map(b"".join)


class Pieces(io.RawIOBase):
    """A binary that hands out its bytes in given pieces."""

    def __init__(self, pieces: list[bytes]) -> None:
        self.pieces = [piece for piece in pieces if piece]

    def read1(self, size: int) -> bytes:
        return self.pieces.pop(0) if self.pieces else b""


def cut(data: bytes, places: list[int]) -> list[bytes]:
    edges = [0, *sorted(place % (len(data) + 1) for place in places), len(data)]
    return [data[a:b] for a, b in pairwise(edges)]


@given(PROGRAMS, st.lists(st.integers(min_value=0)))
def test_lines_are_those_of_the_plain_rule_at_any_cut(data: bytes, places: list[int]) -> None:
    assert list(iter_lines(Pieces(cut(data, places)))) == re.findall(rb"[^\r\n]*(?:\r\n|\r|\n)|[^\r\n]+", data)


@given(PROGRAMS)
def test_lines_joined_are_the_input(data: bytes) -> None:
    assert b"".join(iter_lines(io.BytesIO(data))) == data


def test_only_cr_and_lf_end_a_line() -> None:
    assert list(iter_lines(io.BytesIO(b"a\x0bb\x0cc\x1cd\x85e"))) == [b"a\x0bb\x0cc\x1cd\x85e"]


def test_a_line_of_one_megabyte_passes() -> None:
    data = b"(" + b"a" * (1 << 20) + b")\r\nG1\n"
    assert [len(line) for line in iter_lines(io.BytesIO(data))] == [(1 << 20) + 4, 3]


@pytest.mark.parametrize("end", [b"", b"\n", b"\r", b"\r\n", b"\nG1\n"])
@pytest.mark.parametrize("beyond", [-1, 0, 1])
def test_the_longest_line_is_the_same_at_any_cut(end: bytes, beyond: int) -> None:
    line = b"a" * (LONGEST_LINE + beyond - len(end.removesuffix(b"G1\n"))) + end
    data = b"G21\n" + line
    for size in (7919, 1 << 16):
        pieces = [data[at : at + size] for at in range(0, len(data), size)]
        if beyond <= 0:
            assert b"".join(iter_lines(Pieces(pieces))) == data
        else:
            with pytest.raises(Refusal) as refused:
                list(iter_lines(Pieces(pieces)))
            assert refused.value.line == 2
            assert len(str(refused.value)) < 200


def test_a_long_line_in_many_small_pieces_takes_linear_time() -> None:
    def seconds(size: int) -> float:
        best = float("inf")
        for _ in range(3):
            pieces = Pieces([])
            pieces.pieces = [b"a" * 16] * (size // 16)
            pieces.pieces.reverse()
            pieces.read1 = lambda _size, left=pieces.pieces: left.pop() if left else b""  # type: ignore[method-assign]
            start = time.process_time()
            assert sum(map(len, iter_lines(pieces))) == size
            best = min(best, time.process_time() - start)
        return best

    # Four times the length: linear is 4, quadratic 16.
    assert seconds(1 << 20) < 9 * seconds(1 << 18)


def test_a_failing_read_is_told_with_its_label() -> None:
    class Failing(io.RawIOBase):
        def read1(self, size: int) -> bytes:
            raise OSError(5, "Input/output error")

    with pytest.raises(ReadFailed, match=r"cannot read part\.nc: Input/output error"):
        list(iter_lines(Failing(), "part.nc"))
