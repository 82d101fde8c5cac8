"""The output folder: files appear in it complete and all together, or not at all."""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from pathlib import Path

from ductsolve.errors import CaseError


@contextmanager
def staged(folder: str | Path, names: Iterable[str]) -> Iterator[Path]:
    """Give a fresh place to write files of these names, and move them into ``folder`` at the end.

    That the folder can be made and written is found out here, before any work; when the work fails,
    nothing of it stays and what was in the folder is as it was.

    Raises
    ------
    CaseError
        when the folder or one of the files cannot be written
    """
    folder = Path(folder)
    made: list[Path] = []
    try:
        _check(folder, names)
        _make(folder, made)
        stage = Path(tempfile.mkdtemp(prefix=".unfinished-", dir=folder))
    except (OSError, ValueError) as error:
        _remove(made)
        if isinstance(error, CaseError):
            raise
        raise _unwritable(folder, error) from None
    made.append(stage)
    try:
        yield stage
        for path in sorted(stage.iterdir()):
            path.replace(folder / path.name)
        made.clear()
        shutil.rmtree(stage, ignore_errors=True)
    except OSError as error:
        raise _unwritable(folder, error) from None
    finally:
        _remove(made)


def _check(folder: Path, names: Iterable[str]) -> None:
    """Refuse what stands in the way: a file instead of the folder, a folder instead of a file."""
    for parent in [folder, *folder.parents]:
        if parent.exists():
            if not parent.is_dir():
                raise CaseError(f"--out {folder}: {parent} is a file; give a folder")
            break
    for name in names:
        if (folder / name).is_dir():
            raise CaseError(f"--out {folder}: {name} in it is a folder; move it away or give another folder")


def _make(folder: Path, made: list[Path]) -> None:
    """Make the folder with its parents, keeping track of what is new."""
    missing = [parent for parent in [folder, *folder.parents] if not parent.exists()]
    for path in reversed(missing):
        path.mkdir()
        made.append(path)


def _remove(made: list[Path]) -> None:
    """Take back folders that were made, the last first; one that others have used meanwhile stays."""
    for path in reversed(made):
        if path.name.startswith(".unfinished-"):
            shutil.rmtree(path, ignore_errors=True)
        elif not any(path.iterdir()):
            path.rmdir()


def _unwritable(folder: Path, error: Exception) -> CaseError:
    reason = getattr(error, "strerror", None) or str(error)
    return CaseError(f"--out {folder}: cannot write there ({reason}); give another folder")
