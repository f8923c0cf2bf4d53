"""Streams through real pipes and files: nothing half written, nothing silent, no surprise for the shell."""

from __future__ import annotations

import os
import select
import signal
import stat
import subprocess
from collections.abc import Iterator
from pathlib import Path

import pytest

from gcodetool.cli import streams
from gcodetool.cli.streams import OutputRefused, WriteFailed, draft, open_source

ODD = b"%\r\n(caf\xe9 \x00 \xff)\rG1 X1\nM30"
LONG = b"G1 X1.5 Y2.5\n" * 200_000
needs_full = pytest.mark.skipif(not Path("/dev/full").exists(), reason="no /dev/full here")


@pytest.fixture
def program(tmp_path: Path) -> Path:
    path = tmp_path / "part.nc"
    path.write_bytes(ODD)
    return path


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    path = tmp_path / "out"
    path.mkdir()
    return path


# Bytes in, the same bytes out.


@pytest.mark.parametrize("data", [b"", b"\n", ODD, LONG], ids=["empty", "blank", "odd", "long"])
@pytest.mark.parametrize("verb", [["copy", "-"], ["twice", "-"], ["live"]])
def test_a_pipe_comes_out_as_it_went_in(drive, verb: list[str], data: bytes) -> None:
    done = drive(*verb, stdin=data, env={"PYTHONIOENCODING": "utf-8:strict"})
    assert (done.returncode, done.stdout, done.stderr) == (0, data, b"")


@pytest.mark.parametrize("verb", ["copy", "twice", "live"])
def test_a_file_comes_out_as_it_went_in(drive, program: Path, verb: str) -> None:
    name = ["--source", program] if verb == "live" else [program]
    done = drive(verb, *name)
    assert (done.returncode, done.stdout, done.stderr) == (0, ODD, b"")


def test_standard_input_from_the_middle_of_a_file_starts_there(drive, program: Path) -> None:
    with program.open("rb", buffering=0) as file:
        file.seek(3)
        done = drive("twice", "-", stdin_file=file)
    assert done.stdout == ODD[3:]


def test_a_named_pipe_can_be_read_twice(driver, environment, tmp_path: Path) -> None:
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    with subprocess.Popen([*driver, "twice", str(pipe)], stdout=subprocess.PIPE, env=environment) as child:
        pipe.write_bytes(ODD)
        assert child.communicate(timeout=60)[0] == ODD


def test_a_missing_program_is_told(drive, tmp_path: Path) -> None:
    done = drive("copy", tmp_path / "none.nc")
    assert (done.returncode, done.stdout) == (74, b"")
    assert done.stderr.decode() == f"gcodetool: cannot read {tmp_path / 'none.nc'}: No such file or directory\n"


def test_a_folder_is_no_program(drive, tmp_path: Path) -> None:
    assert drive("copy", tmp_path).returncode == 74


def test_closed_standard_streams_are_told(driver, environment) -> None:
    for closed, code in (("<&-", 74), (">&-", 74)):
        line = f'"$0" "$1" copy - {closed}'
        shell = ["bash", "-c", line, *driver]
        done = subprocess.run(shell, input=b"G1\n", capture_output=True, env=environment, check=False)
        assert done.returncode == code
        assert b"it is closed" in done.stderr


def test_closed_standard_output_is_told_before_reading(driver, environment) -> None:
    shell = ["bash", "-c", '"$0" "$1" copy - >&-', *driver]
    with subprocess.Popen(shell, stdin=subprocess.PIPE, stderr=subprocess.PIPE, env=environment) as child:
        # Standard input stays open and silent: the answer must not wait for it.
        assert child.wait(timeout=60) == 74


# A result appears whole or not at all.


def test_a_file_is_written_with_the_usual_mode(drive, program: Path, folder: Path) -> None:
    target = folder / "new.nc"
    assert drive("copy", program, "--output", target).returncode == 0
    assert target.read_bytes() == ODD
    mask = os.umask(0)
    os.umask(mask)
    assert stat.S_IMODE(target.stat().st_mode) == 0o666 & ~mask
    assert list(folder.iterdir()) == [target]


def test_an_existing_file_stays_unless_forced(drive, program: Path, folder: Path) -> None:
    target = folder / "old.nc"
    target.write_bytes(b"old")
    target.chmod(0o640)
    done = drive("copy", program, "--output", target)
    assert (done.returncode, target.read_bytes()) == (2, b"old")
    assert b"exists" in done.stderr
    assert drive("copy", program, "--output", target, "--force").returncode == 0
    assert target.read_bytes() == ODD
    assert stat.S_IMODE(target.stat().st_mode) == 0o640
    assert list(folder.iterdir()) == [target]


@pytest.mark.parametrize("force", [[], ["--force"]])
def test_the_input_is_never_the_output(drive, program: Path, tmp_path: Path, force: list[str]) -> None:
    other = tmp_path / "link.nc"
    other.symlink_to(program)
    for name in (program, other):
        done = drive("copy", program, "--output", name, *force)
        assert done.returncode == 2
        assert b"is the input" in done.stderr
    with program.open("rb") as file:
        assert drive("copy", "-", "--output", program, *force, stdin_file=file).returncode == 2
    assert program.read_bytes() == ODD


def test_a_forced_link_is_written_through(drive, program: Path, folder: Path) -> None:
    real, link = folder / "real.nc", folder / "link.nc"
    real.write_bytes(b"old")
    link.symlink_to(real)
    assert drive("copy", program, "--output", link, "--force").returncode == 0
    assert link.is_symlink()
    assert real.read_bytes() == ODD


def test_a_refusal_leaves_nothing_anywhere(drive, folder: Path) -> None:
    text = b"G1\nG2\nrefuse\n"
    done = drive("copy", "-", stdin=text)
    assert (done.returncode, done.stdout) == (65, b"")
    assert done.stderr == b"gcodetool: line 3: refuse: for the test. Leave it out.\n"
    assert drive("copy", "-", "--output", folder / "new.nc", stdin=text).returncode == 65
    assert list(folder.iterdir()) == []


def test_a_missing_folder_is_told_before_reading(driver, environment, tmp_path: Path) -> None:
    line = [*driver, "copy", "-", "--output", str(tmp_path / "none" / "new.nc")]
    with subprocess.Popen(line, stdin=subprocess.PIPE, stderr=subprocess.PIPE, env=environment) as child:
        # Standard input stays open and silent: the answer must not wait for it.
        assert child.wait(timeout=60) == 74
        assert child.stderr is not None
        assert b"No such file or directory" in child.stderr.read()


@needs_full
def test_a_device_is_written_to_and_not_replaced(drive, program: Path) -> None:
    assert drive("copy", program, "--output", "/dev/null").returncode == 0
    assert drive("copy", program, "--output", "/dev/full").returncode == 74
    assert stat.S_ISCHR(os.stat("/dev/null").st_mode)
    assert stat.S_ISCHR(os.stat("/dev/full").st_mode)


def test_a_name_taken_meanwhile_is_not_overwritten(folder: Path) -> None:
    target = folder / "new.nc"
    with pytest.raises(OutputRefused), draft(str(target)) as out:  # noqa: PT012 - the steps belong together
        out.write(b"mine")
        target.write_bytes(b"theirs")
        out.release()
    assert target.read_bytes() == b"theirs"
    assert list(folder.iterdir()) == [target]


def test_a_card_without_hard_links_or_modes_is_written_too(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def cannot(*_: object) -> None:
        raise PermissionError(1, "Operation not permitted")

    monkeypatch.setattr(streams.os, "link", cannot)
    monkeypatch.setattr(streams.os, "chmod", cannot)
    target = folder / "new.nc"
    with draft(str(target)) as out:
        out.write(b"mine")
        out.release()
    assert target.read_bytes() == b"mine"
    assert list(folder.iterdir()) == [target]


def test_a_full_disk_leaves_the_old_file(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    target = folder / "old.nc"
    target.write_bytes(b"old")
    monkeypatch.setattr(streams.os, "fsync", full)
    with pytest.raises(WriteFailed, match="No space left"), draft(str(target), force=True) as out:  # noqa: PT012
        out.write(b"new")
        out.release()
    assert target.read_bytes() == b"old"
    assert list(folder.iterdir()) == [target]


@pytest.mark.parametrize("forced", [False, True])
@pytest.mark.parametrize("how", [signal.SIGKILL, signal.SIGTERM, signal.SIGINT])
def test_ended_in_the_middle_there_is_no_half_file(driver, environment, folder: Path, how: int, forced: bool) -> None:
    target = folder / "part.nc"
    if forced:
        target.write_bytes(b"old")
    line = [*driver, "copy", "-", "--slow", "--output", str(target), *(["--force"] if forced else [])]
    pipes = {"stdin": subprocess.PIPE, "stderr": subprocess.PIPE, "stdout": subprocess.DEVNULL}
    with subprocess.Popen(line, env=environment, **pipes) as child:
        assert child.stdin is not None
        assert child.stderr is not None
        child.stdin.write(b"G1 X1\n")
        child.stdin.flush()
        assert child.stderr.readline() == b"kept\n"
        child.send_signal(how)
        code = child.wait(timeout=60)
    assert code == {signal.SIGKILL: -9, signal.SIGTERM: 143, signal.SIGINT: 130}[signal.Signals(how)]
    assert target.exists() == forced
    if forced:
        assert target.read_bytes() == b"old"
    left = [path.name for path in folder.iterdir() if path != target]
    assert all(name.startswith(".gcodetool-") for name in left)
    assert len(left) == (how == signal.SIGKILL)


# The reader goes, or the disk is full.


@pytest.mark.parametrize("verb", [["copy", "-"], ["live"]])
def test_a_reader_that_takes_one_line_gives_141_and_no_noise(driver, environment, verb: list[str]) -> None:
    with subprocess.Popen(
        [*driver, *verb], stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.PIPE, env=environment
    ) as child:
        reader = subprocess.Popen(["head", "-1"], stdin=child.stdout, stdout=subprocess.PIPE)
        assert child.stdin is not None
        assert child.stdout is not None
        assert child.stderr is not None
        child.stdout.close()
        try:
            child.stdin.write(LONG)
            child.stdin.close()
        except BrokenPipeError:
            pass
        assert reader.communicate(timeout=60)[0] == b"G1 X1.5 Y2.5\n"
        assert child.wait(timeout=60) == 141
        assert child.stderr.read() == b""


@pytest.mark.parametrize("arguments", [["copy", "-"], ["live"], ["--help"], ["--version"], ["machine", "new"]])
def test_a_reader_gone_before_the_first_byte_gives_141_and_no_noise(drive, gone: int, arguments: list[str]) -> None:
    done = drive(*arguments, stdin=b"G1\n", stdout=gone, stderr=subprocess.PIPE)
    assert (done.returncode, done.stderr) == (141, b"")


@pytest.fixture
def gone() -> Iterator[int]:
    """The writing end of a pipe whose reader has left."""
    reading, writing = os.pipe()
    os.close(reading)
    yield writing
    os.close(writing)


@needs_full
@pytest.mark.parametrize("size", [1, 200_000], ids=["small", "large"])
@pytest.mark.parametrize("verb", [["copy", "-"], ["live"]])
def test_a_full_disk_behind_standard_output_gives_74_and_one_line(drive, verb: list[str], size: int) -> None:
    with open("/dev/full", "wb") as full:
        done = drive(*verb, stdin=b"G1 X1\n" * size, stdout=full, stderr=subprocess.PIPE)
    assert done.returncode == 74
    assert done.stderr == b"gcodetool: cannot write standard output: No space left on device\n"


@needs_full
@pytest.mark.parametrize("arguments", [["--help"], ["--version"], ["machine", "new"]])
def test_a_full_disk_behind_help_gives_74(drive, arguments: list[str]) -> None:
    with open("/dev/full", "wb") as full:
        done = drive(*arguments, stdout=full, stderr=subprocess.PIPE)
    assert done.returncode == 74
    assert done.stderr.count(b"\n") == 1


@needs_full
def test_messages_that_cannot_be_written_do_not_change_the_code(drive) -> None:
    with open("/dev/full", "wb") as full:
        assert drive("copy", "-", stdin=b"refuse\n", stdout=subprocess.PIPE, stderr=full).returncode == 65


def test_a_live_line_is_answered_while_the_sender_waits(driver, environment) -> None:
    with subprocess.Popen([*driver, "live"], stdin=subprocess.PIPE, stdout=subprocess.PIPE, env=environment) as child:
        assert child.stdin is not None
        assert child.stdout is not None
        for line in (b"G0 X1\n", b"G0 X2\r\n"):
            child.stdin.write(line)
            child.stdin.flush()
            ready, _, _ = select.select([child.stdout], [], [], 30)
            assert ready
            assert os.read(child.stdout.fileno(), 1000) == line


# Memory does not follow the length.


def peak_megabytes(driver, environment, lines: int, *options: str) -> float:
    feed = subprocess.Popen(["bash", "-c", f"yes 'G1 X1.2345 Y2.3456' | head -n {lines}"], stdout=subprocess.PIPE)
    line = [*driver, "memory", *options]
    done = subprocess.run(line, stdin=feed.stdout, env=environment, capture_output=True, check=True)
    feed.wait()
    count, kilobytes = done.stdout.split()
    assert int(count) == lines
    return int(kilobytes) / 1024


needs_proc = pytest.mark.skipif(not Path("/proc/self/status").exists(), reason="peak memory is read from /proc")


@needs_proc
@pytest.mark.parametrize("options", [[], ["--live"]], ids=["spooled", "live"])
def test_a_million_lines_pass_in_flat_memory(driver, environment, options: list[str]) -> None:
    few = peak_megabytes(driver, environment, 100_000, *options)
    many = peak_megabytes(driver, environment, 1_000_000, *options)
    assert many < few + 4
    assert many < 80


@needs_proc
@pytest.mark.long
@pytest.mark.parametrize("options", [[], ["--live"]], ids=["spooled", "live"])
def test_ten_million_lines_pass_in_flat_memory(driver, environment, options: list[str]) -> None:
    assert peak_megabytes(driver, environment, 10_000_000, *options) < 80


def test_a_source_knows_its_size_and_label(program: Path) -> None:
    with open_source(str(program)) as source:
        assert (source.label, source.size, b"".join(source.lines())) == (str(program), len(ODD), ODD)
