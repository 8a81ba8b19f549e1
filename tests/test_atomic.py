"""A target holds the old content or the new, never a part."""

import errno
import os
import stat
import subprocess
import sys
from pathlib import Path

import pytest

from geomprep.atomic import atomic_writer, write_atomic
from geomprep.errors import InputError


def test_new_content_takes_the_place_of_the_old(tmp_path: Path) -> None:
    target = tmp_path / "network.json"
    write_atomic(target, b"old")
    write_atomic(target, b"new")
    assert target.read_bytes() == b"new"
    assert [path.name for path in tmp_path.iterdir()] == ["network.json"]


def test_a_fault_while_writing_leaves_the_old_content_and_no_litter(tmp_path: Path) -> None:
    target = tmp_path / "network.json"
    target.write_bytes(b"old")
    with pytest.raises(ZeroDivisionError), atomic_writer(target) as stream:
        stream.write(b"half of the n")
        raise ZeroDivisionError
    assert target.read_bytes() == b"old"
    assert [path.name for path in tmp_path.iterdir()] == ["network.json"]


def test_a_killed_process_leaves_the_old_content(tmp_path: Path) -> None:
    target = tmp_path / "network.json"
    target.write_bytes(b"old")
    program = (
        "import sys, time\nfrom geomprep.atomic import atomic_writer\n"
        "with atomic_writer(sys.argv[1]) as stream:\n"
        "    stream.write(b'x' * 10**6); stream.flush(); print('writing', flush=True); time.sleep(60)\n"
    )
    with subprocess.Popen([sys.executable, "-c", program, str(target)], stdout=subprocess.PIPE) as process:
        assert process.stdout is not None
        assert process.stdout.readline() == b"writing\n"
        process.kill()
    assert target.read_bytes() == b"old"


def test_full_disk_is_one_line(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(handle: int) -> None:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    monkeypatch.setattr(os, "fsync", full)
    target = tmp_path / "network.json"
    target.write_bytes(b"old")
    with pytest.raises(InputError, match=r"^.*network.json: cannot be written: No space left on device; .*room$"):
        write_atomic(target, b"new")
    assert target.read_bytes() == b"old"
    assert len(list(tmp_path.iterdir())) == 1


def test_missing_folder_and_folder_as_target_are_one_line(tmp_path: Path) -> None:
    for target in (tmp_path / "missing" / "x.json", tmp_path):
        with pytest.raises(InputError, match="cannot be written") as caught:
            write_atomic(target, b"new")
        assert "\n" not in str(caught.value)
    assert list(tmp_path.iterdir()) == []


def test_rights_are_those_of_a_new_file(tmp_path: Path) -> None:
    (tmp_path / "plain").write_bytes(b"")
    write_atomic(tmp_path / "atomic", b"")
    modes = {stat.S_IMODE((tmp_path / name).stat().st_mode) for name in ("plain", "atomic")}
    assert len(modes) == 1
