"""Lines and their ends: every byte comes back, whatever it is."""

from __future__ import annotations

import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.program.blocks import Block, blocks, blocks_of, split_lines


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        (b"", []),
        (b"G1", [Block(1, "G1", "")]),
        (b"G1\n", [Block(1, "G1", "\n")]),
        (b"G1\r\nG2\r\n", [Block(1, "G1", "\r\n"), Block(2, "G2", "\r\n")]),
        (b"G1\rG2\rG3", [Block(1, "G1", "\r"), Block(2, "G2", "\r"), Block(3, "G3", "")]),
        (b"G1\nG2\r\nG3\rG4", [Block(1, "G1", "\n"), Block(2, "G2", "\r\n"), Block(3, "G3", "\r"), Block(4, "G4", "")]),
        (b"\n\n", [Block(1, "", "\n"), Block(2, "", "\n")]),
        (b"G1\n\rG2", [Block(1, "G1", "\n"), Block(2, "", "\r"), Block(3, "G2", "")]),
    ],
)
def test_each_line_keeps_its_own_end(program: bytes, expected: list[Block]) -> None:
    assert list(blocks_of(program)) == expected


@pytest.mark.parametrize("byte", [0x00, 0x0B, 0x0C, 0x1A, 0x1C, 0x1D, 0x1E, 0x7F, 0x85, 0xA0, 0xFF])
def test_no_other_byte_ends_a_line(byte: int) -> None:
    """Tape leaders, form feeds and latin-1 marks that text readers take for line ends are not ends for a controller."""
    found = list(blocks_of(b"G1 X1" + bytes([byte]) + b"Y2\r\nG2"))
    assert [block.number for block in found] == [1, 2]
    assert found[0].text == "G1 X1" + chr(byte) + "Y2"


def test_bytes_that_are_no_utf8_are_one_character_each() -> None:
    (block,) = blocks_of(b"(T\xfcr\xe9\x80)")
    assert block.text.encode("latin-1") == b"(T\xfcr\xe9\x80)"
    assert len(block.text) == 7


@given(st.binary(max_size=300))
def test_text_and_ends_joined_are_the_program(program: bytes) -> None:
    found = list(blocks_of(program))
    assert "".join(block.text + block.ending for block in found).encode("latin-1") == program
    assert [block.number for block in found] == list(range(1, len(found) + 1))
    assert not any(mark in block.text for block in found for mark in "\r\n")


@given(st.lists(st.sampled_from([b"G1", b"\r", b"\n", b"\r\n", b"X\xe9"]), max_size=40).map(b"".join))
def test_lines_joined_are_the_program(program: bytes) -> None:
    lines = split_lines(program)
    assert b"".join(lines) == program
    assert all(lines)


def test_blocks_are_made_one_by_one() -> None:
    """A stream without end can be read."""

    def endless() -> object:
        while True:
            yield b"G1 X1\n"

    stream = blocks(endless())  # type: ignore[arg-type]
    assert [next(stream).number for _ in range(3)] == [1, 2, 3]
    assert next(iter(blocks(io.BytesIO(b"M30")))) == Block(1, "M30", "")
