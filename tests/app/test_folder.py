"""The output folder: all files or none, and nothing that was there is touched before."""

import os
from pathlib import Path

import pytest

from ductsolve.app.folder import staged
from ductsolve.errors import CaseError

NAMES = ["one.txt", "two.txt"]


def everything_in(folder):
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*"))


def write_both(stage):
    for name in NAMES:
        (stage / name).write_text(f"new {name}")


def test_files_appear_together_and_nothing_else(tmp_path):
    target = tmp_path / "a" / "b"
    with staged(target, NAMES) as stage:
        write_both(stage)
        assert not [name for name in everything_in(target) if name in NAMES]
    assert everything_in(target) == NAMES
    assert (target / "one.txt").read_text() == "new one.txt"


def test_files_are_replaced(tmp_path):
    (tmp_path / "one.txt").write_text("old")
    (tmp_path / "notes.txt").write_text("mine")
    with staged(tmp_path, NAMES) as stage:
        write_both(stage)
    assert everything_in(tmp_path) == ["notes.txt", *NAMES]
    assert (tmp_path / "one.txt").read_text() == "new one.txt"


@pytest.mark.parametrize("failure", [RuntimeError, KeyboardInterrupt, CaseError])
def test_failure_leaves_what_was_there(tmp_path, failure):
    (tmp_path / "one.txt").write_text("old")
    with pytest.raises(failure):
        with staged(tmp_path, NAMES) as stage:
            write_both(stage)
            raise failure("in the middle")
    assert everything_in(tmp_path) == ["one.txt"]
    assert (tmp_path / "one.txt").read_text() == "old"


def test_failure_takes_new_folders_back(tmp_path):
    with pytest.raises(RuntimeError):
        with staged(tmp_path / "a" / "b", NAMES):
            raise RuntimeError
    assert everything_in(tmp_path) == []


def test_a_full_disk_is_one_line(tmp_path):
    with pytest.raises(CaseError, match="cannot write there .No space left"):
        with staged(tmp_path, NAMES):
            raise OSError(28, "No space left on device")
    assert everything_in(tmp_path) == []


@pytest.mark.parametrize("where", ["file", "file/below", "file/below/more"])
def test_a_file_in_the_way(tmp_path, where):
    (tmp_path / "file").write_text("mine")
    with pytest.raises(CaseError, match="is a file; give a folder"):
        with staged(tmp_path / where, NAMES):
            pytest.fail("no work is done for a folder that cannot be")
    assert (tmp_path / "file").read_text() == "mine"


def test_a_folder_in_the_way_of_a_file(tmp_path):
    (tmp_path / "two.txt").mkdir()
    with pytest.raises(CaseError, match="two.txt in it is a folder"):
        with staged(tmp_path, NAMES):
            pytest.fail("no work is done for a file that cannot be")


@pytest.mark.skipif(os.name != "posix", reason="needs a file system that takes no files")
def test_a_folder_that_takes_no_files():
    with pytest.raises(CaseError, match="cannot write there"):
        with staged(Path("/proc/ductsolve"), NAMES):
            pytest.fail("no work is done for a folder that cannot be made")


def test_a_name_no_file_system_takes():
    with pytest.raises(CaseError):
        with staged(Path("a\0b"), NAMES):
            pytest.fail("no work is done for a folder that cannot be made")
