"""Bytes in and bytes out: standard streams, files that are never half written, lines with their own endings.

A program is bytes.  It is decoded as latin-1, in which every byte is one character and comes back as the same byte.
Nothing of a result appears under its real name, or on standard output, before ``Draft.release``; only ``Output`` on
standard output, meant for a live link, writes at once.
"""

from __future__ import annotations

import contextlib
import os
import stat
import sys
import tempfile
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from typing import IO

from gcodetool.cli.terminal import say
from gcodetool.errors import GcodetoolError, Refusal

ENCODING = "latin-1"
CHUNK = 1 << 16
LONGEST_LINE = (1 << 20) + 4096
IN_MEMORY = 1 << 20


class ReadFailed(GcodetoolError):
    """An input could not be read."""


class WriteFailed(GcodetoolError):
    """An output could not be written: a full disk, a missing folder."""


class ReaderLeft(GcodetoolError):
    """The reader of standard output went away."""


class OutputRefused(GcodetoolError):
    """The output would overwrite the input or an existing file."""


def iter_lines(binary: IO[bytes], label: str = "the program") -> Iterator[bytes]:
    r"""Lines with their endings: ``\r\n``, ``\n`` or a lone ``\r``; the last may have none.  Joined they are the input.

    At most one chunk and one line are held.  A ``\r`` that ends a chunk waits for the next byte.  Raises Refusal for a
    line longer than ``LONGEST_LINE`` and ReadFailed.
    """
    held, count = bytearray(), 0  # the line that has not ended yet
    for chunk in _chunks(binary, label):
        if held.endswith(b"\r") and not chunk.startswith(b"\n"):
            count += 1
            yield bytes(held)
            held.clear()
        lines = chunk.splitlines(keepends=True)
        if held:
            held += lines[0]
            if len(held) > LONGEST_LINE:
                raise _too_long(count + 1, held)
            if len(lines) == 1 and not held.endswith(b"\n"):
                continue
            lines[0] = bytes(held)
            held.clear()
        if not lines[-1].endswith(b"\n"):
            held += lines.pop()
        count += len(lines)
        yield from lines
    if held:
        yield bytes(held)


def _chunks(binary: IO[bytes], label: str) -> Iterator[bytes]:
    """What is there, at once, so that a live link is answered without waiting for a full chunk."""
    read = getattr(binary, "read1", binary.read)
    try:
        while chunk := read(CHUNK):
            yield chunk
    except OSError as fault:
        raise ReadFailed(f"cannot read {label}: {fault.strerror or fault}") from fault


def _too_long(line: int, held: bytearray) -> Refusal:
    start = held[:20].decode(ENCODING)
    reason = f"the line is longer than {LONGEST_LINE} bytes, so this is no program text"
    return Refusal(line, f"{start}...", reason, "Give a program with one block on each line")


@dataclass(frozen=True, slots=True)
class Source:
    """An input that can be read from its start as often as needed (a live one only once).

    ``label`` names it in messages, ``size`` is in bytes and None for a live one.
    """

    label: str
    binary: IO[bytes]
    start: int = 0
    size: int | None = None

    def lines(self) -> Iterator[bytes]:
        """All lines with their endings, from the start."""
        if self.size is not None:
            self.binary.seek(self.start)
        return iter_lines(self.binary, self.label)


@contextlib.contextmanager
def open_source(path: str, name: str | None = None, *, live: bool = False) -> Iterator[Source]:
    """The program in a file, or on standard input where ``path`` is ``-``; ``name`` labels standard input in messages.

    A pipe is copied to a temporary file first, unless ``live``.  Raises ReadFailed.
    """
    label = (name or "standard input") if path == "-" else path
    with contextlib.ExitStack() as stack:
        try:
            binary = _standard_input() if path == "-" else stack.enter_context(open(path, "rb"))
            if not live and not binary.seekable():
                binary = stack.enter_context(_spool(binary, label))
            start = None if live else binary.tell()
            size = None if start is None else binary.seek(0, os.SEEK_END) - start
            if start is not None:
                binary.seek(start)
        except OSError as fault:
            raise ReadFailed(f"cannot read {label}: {fault.strerror or fault}") from fault
        yield Source(label, binary, start or 0, size)


def _standard_input() -> IO[bytes]:
    if sys.stdin is None:
        raise ReadFailed("cannot read standard input: it is closed")
    if sys.stdin.isatty():
        say("reading the program from the terminal; end it with Ctrl-D, or stop with Ctrl-C")
    return sys.stdin.buffer


def _spool(binary: IO[bytes], label: str) -> IO[bytes]:
    """Copy all chunks; a terminal ends with one Ctrl-D, since no read is tried after an empty one."""
    spool = tempfile.SpooledTemporaryFile(IN_MEMORY)  # noqa: SIM115 - the caller closes it
    for chunk in _chunks(binary, label):
        try:
            spool.write(chunk)
        except OSError as fault:
            folder = tempfile.gettempdir()
            raise WriteFailed(f"cannot keep {label} in {folder}: {fault.strerror or fault}") from fault
    spool.seek(0)
    return spool


@dataclass(frozen=True, slots=True)
class Output:
    """A binary output whose failures are told in words; ``label`` names it in messages."""

    label: str
    binary: IO[bytes]

    def write(self, data: bytes) -> None:
        """Write bytes.  Raises ReaderLeft or WriteFailed, as all methods here do."""
        with _told(self):
            self.binary.write(data)

    def writelines(self, lines: Iterable[bytes]) -> None:
        """Write all lines; what the iterator itself raises passes through, as long as it is no OSError."""
        with _told(self):
            self.binary.writelines(lines)

    def flush(self) -> None:
        """Hand everything on to the reader now."""
        with _told(self):
            self.binary.flush()


@contextlib.contextmanager
def _told(output: Output) -> Iterator[None]:
    try:
        yield
    except OSError as fault:
        if sys.stdout is not None and output.binary is sys.stdout.buffer:
            _silence(1)
        if isinstance(fault, BrokenPipeError):
            raise ReaderLeft(f"the reader of {output.label} is gone") from fault
        raise WriteFailed(f"cannot write {output.label}: {fault.strerror or fault}") from fault


def _silence(descriptor: int) -> None:
    """Point a standard stream at nowhere, or what is left in its buffer fails again when Python ends."""
    nowhere = os.open(os.devnull, os.O_WRONLY)
    os.dup2(nowhere, descriptor)
    os.close(nowhere)


def standard_output() -> Output:
    """Standard output as bytes, written at once.  Raises WriteFailed where it is closed."""
    if sys.stdout is None:
        raise WriteFailed("cannot write standard output: it is closed")
    return Output("standard output", sys.stdout.buffer)


@dataclass(frozen=True, slots=True)
class Draft(Output):
    """A result that nobody sees before ``release``.

    ``target`` is a path or ``-``; ``part`` is the temporary file that takes its name, None where there is none to take
    (standard output, a device, a named pipe).
    """

    target: str = "-"
    part: str | None = None
    force: bool = False

    def lines(self) -> Iterator[bytes]:
        """What was written so far, from the start; write no more afterwards."""
        self.flush()
        self.binary.seek(0)
        return iter_lines(self.binary, self.label)

    def release(self) -> None:
        """Let the result appear, whole or not at all.  Raises OutputRefused where the name has been taken meanwhile."""
        self.flush()
        if self.part is not None:
            with _told(self):
                _publish(self.binary, self.part, self.target, self.force)
            return
        self.binary.seek(0)
        with _sink(self) as sink:
            sink.writelines(iter(lambda: self.binary.read(CHUNK), b""))
            sink.flush()


@contextlib.contextmanager
def draft(target: str = "-", *, force: bool = False, inputs: Sequence[str] = ()) -> Iterator[Draft]:
    """A draft for a file, or for standard output where ``target`` is ``-``; thrown away unless released.

    Enter it before reading, so that a bad name is told at once.  Raises OutputRefused where ``target`` is one of the
    ``inputs`` (paths, or ``-``), or exists and ``force`` is not set; WriteFailed where the folder cannot be written.
    """
    if target == "-":
        standard_output()  # closed: say so before the work
    if target == "-" or _is_special(target):
        with tempfile.SpooledTemporaryFile(IN_MEMORY) as binary:
            yield Draft("standard output" if target == "-" else target, binary, target)
        return
    _check_target(target, force, inputs)
    real = os.path.realpath(target)
    with _temporary_beside(real, target) as (file, part):
        yield Draft(target, file, real, part, force)


def _is_special(target: str) -> bool:
    """True for a device or a pipe, which a rename would destroy."""
    if os.path.isdir(target):
        raise WriteFailed(f"cannot write {target}: it is a folder")
    return os.path.exists(target) and not os.path.isfile(target)


def _check_target(target: str, force: bool, inputs: Sequence[str]) -> None:
    if not os.path.exists(target):
        return
    here = os.stat(target)
    for path in inputs:
        with contextlib.suppress(OSError, ValueError, AttributeError):
            if os.path.samestat(here, os.fstat(sys.stdin.fileno()) if path == "-" else os.stat(path)):
                raise OutputRefused(f"{target} is the input; give the output another name")
    if not force:
        raise _taken(target)


def _taken(target: str) -> OutputRefused:
    return OutputRefused(f"{target} exists; give the output another name, or --force to replace it")


@contextlib.contextmanager
def _temporary_beside(target: str, label: str) -> Iterator[tuple[IO[bytes], str]]:
    """A temporary file in the folder of ``target``: only there can it be renamed in one step."""
    try:
        number, part = tempfile.mkstemp(".part", ".gcodetool-", os.path.dirname(target))
    except OSError as fault:
        raise WriteFailed(f"cannot write {label}: {fault.strerror or fault}") from fault
    try:
        with open(number, "w+b") as file:
            yield file, part
    finally:
        with contextlib.suppress(FileNotFoundError):
            os.unlink(part)


def _publish(file: IO[bytes], part: str, target: str, force: bool) -> None:
    with contextlib.suppress(OSError):  # a memory card may have no modes
        os.chmod(part, _mode(target))
    os.fsync(file.fileno())
    if force:
        os.replace(part, target)
    else:
        _rename_to_free(part, target)
    with contextlib.suppress(OSError):  # not every system can sync a folder
        folder = os.open(os.path.dirname(target), os.O_RDONLY)
        os.fsync(folder)
        os.close(folder)


def _mode(target: str) -> int:
    """The mode of the file to be replaced, or that of a new file."""
    if os.path.exists(target):
        return stat.S_IMODE(os.stat(target).st_mode)
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask


def _rename_to_free(part: str, target: str) -> None:
    """Give the file its name without taking it from another that came meanwhile."""
    try:
        os.link(part, target)
    except FileExistsError:
        raise _taken(target) from None
    except OSError:  # a memory card may have no hard links
        if os.path.exists(target):
            raise _taken(target) from None
        os.replace(part, target)


@contextlib.contextmanager
def _sink(output: Draft) -> Iterator[Output]:
    if output.target == "-":
        yield standard_output()
        return
    with _told(output):
        sink = open(output.target, "wb")  # noqa: SIM115 - closed below, where a failure is told too
    try:
        yield Output(output.label, sink)
    finally:
        with _told(output):
            sink.close()


def flush_standard_output() -> None:
    """Flush what was printed as text, while a failure can still be told.  Raises ReaderLeft or WriteFailed."""
    if sys.stdout is not None:
        with _told(standard_output()):
            sys.stdout.flush()
