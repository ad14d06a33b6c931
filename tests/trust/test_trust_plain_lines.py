"""What stops a run from outside gets one plain line, the right exit code, and leaves nothing behind."""

from __future__ import annotations

import os
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from small_record import write_record
from typer.testing import CliRunner

from reconcile.cli.app import app

COMMAND = (sys.executable, "-m", "reconcile")
NOTHING = "Nothing was written."


@pytest.fixture
def files(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> list[str]:
    monkeypatch.chdir(tmp_path)
    return write_record(tmp_path, {"M-2": 0.12})


def names(folder: Path) -> set[str]:
    return {p.name for p in folder.iterdir()}


def namespace(script: str) -> subprocess.CompletedProcess[str]:
    """Run a shell script that may mount file systems, in a name space of its own; skip where that is not allowed."""
    unshare = shutil.which("unshare")
    if unshare is None or subprocess.run([unshare, "-rm", "true"], capture_output=True, check=False).returncode:
        pytest.skip("no file system can be mounted here")
    return subprocess.run([unshare, "-rm", "sh", "-c", script], capture_output=True, text=True, check=False)


def audit_on_small_disk(files: list[str], option: str) -> subprocess.CompletedProcess[str]:
    """An audit onto a file system that the option makes useless; then lists what it holds."""
    Path("disk").mkdir()
    python = f"'{sys.executable}' -m reconcile"
    return namespace(
        f"mount -t tmpfs -o {option} none disk || exit 99; "
        f"{python} audit {' '.join(files)} --out disk/deep/room; code=$?; ls -A disk; exit $code"
    )


@pytest.mark.parametrize(
    ("option", "said"), [("size=64k", "No space left on device"), ("ro", "Read-only file system")], ids=["full", "ro"]
)
def test_a_full_or_read_only_disk(files: list[str], option: str, said: str) -> None:
    done = audit_on_small_disk(files, option)
    if done.returncode == 99:
        pytest.skip("no file system can be mounted here")
    assert done.returncode == 1
    assert done.stdout == "", "nothing is left on the disk"
    assert done.stderr.splitlines() == [f"{Path('disk/deep/room').resolve()}: {said}", NOTHING]


def test_files_that_may_not_grow(files: list[str], tmp_path: Path) -> None:
    """A quota or a limit of the system (RLIMIT_FSIZE) stops a write like a full disk, in the midst of a file."""
    resource = pytest.importorskip("resource")

    def limited() -> None:
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
        resource.setrlimit(resource.RLIMIT_FSIZE, (20_000, 20_000))

    before = names(tmp_path)
    done = subprocess.run(
        [*COMMAND, "audit", *files, "--out", "deep/room"],
        capture_output=True,
        text=True,
        check=False,
        preexec_fn=limited,
    )
    assert done.returncode == 1
    assert done.stderr.splitlines() == [f"{tmp_path / 'deep' / 'room'}: File too large", NOTHING]
    assert names(tmp_path) == before


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="this system has no /dev/full")
@pytest.mark.parametrize("words", [["--json"], []])
def test_standard_output_that_is_full(files: list[str], words: list[str]) -> None:
    with Path("/dev/full").open("w") as full:
        done = subprocess.run(
            [*COMMAND, "audit", *files, "--out", "room", *words],
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            check=False,
        )
        listed = subprocess.run(
            [*COMMAND, "read", *files, *words], stdout=full, stderr=subprocess.PIPE, text=True, check=False
        )
        helped = subprocess.run([*COMMAND, "--help"], stdout=full, stderr=subprocess.PIPE, text=True, check=False)
    assert done.returncode == 1
    assert done.stderr.splitlines() == [
        "standard output: No space left on device. The report itself is whole, in room."
    ]
    assert Path("room/manifest.json").exists()
    for other in (listed, helped):
        assert (other.returncode, other.stderr) == (1, "standard output: No space left on device\n")


@pytest.mark.skipif(os.name != "posix", reason="signals of POSIX")
@pytest.mark.parametrize("seconds", [0.6, 1.0, 1.4])
def test_ctrl_c(files: list[str], tmp_path: Path, seconds: float) -> None:
    """Wherever the run has got by then: in its imports, reading, drawing, or writing."""
    before = names(tmp_path)
    run = subprocess.Popen(
        [*COMMAND, "audit", *files, "--out", "deep/room"],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )
    time.sleep(seconds)
    run.send_signal(signal.SIGINT)
    out, err = run.communicate(timeout=60)
    if run.returncode == 0:  # it was through before
        assert (tmp_path / "deep" / "room" / "manifest.json").exists()
        return
    assert (run.returncode, out, err) == (130, "", "Interrupted.\n")
    assert names(tmp_path) == before


def test_ctrl_c_while_writing(files: list[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from reconcile.reporter import folder

    def interrupted(path: Path, content: bytes) -> None:
        raise KeyboardInterrupt

    before = names(tmp_path)
    monkeypatch.setattr(folder, "write_file", interrupted)
    done = CliRunner().invoke(app, ["audit", *files, "--out", "deep/room"])
    assert (done.exit_code, done.stdout, done.stderr) == (130, "", "Interrupted.\n")
    assert names(tmp_path) == before


def test_an_input_that_vanishes_after_it_was_seen(files: list[str], monkeypatch: pytest.MonkeyPatch) -> None:
    Path(files[1]).unlink()
    monkeypatch.setattr(Path, "exists", lambda path: True)
    done = CliRunner().invoke(app, ["audit", *files, "--out", "room"])
    assert done.exit_code == 1
    assert done.stderr.splitlines()[-1] == NOTHING
    assert len(done.stderr.splitlines()) == 2
    assert "recipes.csv: the file cannot be opened" in done.stderr


def test_an_input_without_permission(files: list[str], monkeypatch: pytest.MonkeyPatch) -> None:
    real = Path.read_bytes

    def read_bytes(path: Path) -> bytes:
        if path.name == files[0]:
            raise PermissionError(13, "Permission denied", str(path))
        return real(path)

    monkeypatch.setattr(Path, "read_bytes", read_bytes)
    done = CliRunner().invoke(app, ["audit", *files, "--out", "room"])
    assert done.exit_code == 1
    assert "Permission denied" in done.stderr
    assert len(done.stderr.splitlines()) == 2
    assert not Path("room").exists()


@pytest.mark.parametrize(
    ("place", "said"), [("readings.csv/room", "Not a directory"), ("a" * 300, "File name too long")]
)
def test_a_place_that_cannot_be(files: list[str], tmp_path: Path, place: str, said: str) -> None:
    before = names(tmp_path)
    done = CliRunner().invoke(app, ["audit", *files, "--out", place])
    assert (done.exit_code, done.stdout) == (1, "")
    assert done.stderr.splitlines() == [f"{tmp_path / place}: {said}", NOTHING]
    assert names(tmp_path) == before


def test_a_folder_that_may_not_be_written(files: list[str], tmp_path: Path) -> None:
    if os.name != "posix" or os.geteuid() == 0:
        pytest.skip("permissions do not hold this user")
    closed = tmp_path / "closed"
    closed.mkdir(0o500)
    done = CliRunner().invoke(app, ["audit", *files, "--out", "closed/room"])
    assert done.exit_code == 1
    assert done.stderr.splitlines() == [f"{closed / 'room'}: Permission denied", NOTHING]
