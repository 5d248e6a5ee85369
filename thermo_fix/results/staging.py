"""A results folder that is complete or not there."""

import os
import shutil
import tempfile
from pathlib import Path
from types import TracebackType
from typing import Self

from thermo_fix.errors import FolderError, reason_of
from thermo_fix.results.moving import flush_folder, flush_tree, swap

MARK = "findings.json"
"""A folder that holds this file, or nothing, may be replaced."""


class Staging:
    """Collects results beside their place and moves them there when all are written.

    Parameters
    ----------
    target
        The results folder. An older one is replaced as a whole, and only at the end.

    Raises
    ------
    FolderError
        The target is no folder, holds something other than results, or cannot be written beside.

    """

    def __init__(self, target: Path) -> None:
        self._target = target
        self._done = False
        if target.exists():
            if not target.is_dir():
                raise FolderError(f"{target}: is no folder; give another --out")
            if any(target.iterdir()) and not (target / MARK).is_file():
                raise FolderError(
                    f"{target}: holds files but no {MARK}, so it is no results folder; "
                    "give an empty or new --out"
                )
        try:
            target.parent.mkdir(parents=True, exist_ok=True)
            self.folder = Path(tempfile.mkdtemp(prefix=_unfinished(target), dir=target.parent))
        except OSError as error:
            raise FolderError(
                f"{target.parent}: cannot be written ({reason_of(error)}); give another --out"
            ) from error
        # mkdtemp makes a private folder; results are as readable as other files.
        mask = os.umask(0)
        os.umask(mask)
        self.folder.chmod(0o777 & ~mask)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        if not self._done:
            shutil.rmtree(self.folder, ignore_errors=True)

    def finish(self) -> None:
        """Move the results into place, once every byte of them is on the disk.

        Where the system can, new and old results change places in one step; else the old ones step
        aside first, and :func:`recover` puts them back should the run end between the two.

        Raises
        ------
        FolderError
            They cannot be written to the end or moved; an older result is then left as it was.

        """
        older = self._target.with_name(f"{_aside(self._target)}{self.folder.name[-8:]}")
        try:
            flush_tree(self.folder)
            if not self._target.exists():
                self.folder.rename(self._target)
            elif swap(self.folder, self._target):
                older = self.folder
            else:
                self._target.rename(older)
                try:
                    self.folder.rename(self._target)
                except OSError:
                    older.rename(self._target)
                    raise
        except OSError as error:
            raise FolderError(
                f"{self._target}: cannot be put into place ({reason_of(error)}); "
                "make room or close what uses it, and run again"
            ) from error
        self._done = True
        flush_folder(self._target.parent)
        shutil.rmtree(older, ignore_errors=True)


def recover(target: Path) -> None:
    """Clear up after runs that were killed; call it only while no other run is at work.

    A result that stepped aside for one that never came is put back; what was not finished, and
    results that were replaced, are thrown away.

    Raises OSError where the folder cannot be read or the result cannot be put back.
    """
    if not target.parent.is_dir():
        return
    beside = sorted(target.parent.iterdir())
    for folder in beside:
        if not folder.name.startswith(_aside(target)) or folder.is_symlink():
            continue
        if not target.exists() and (folder / MARK).is_file():
            folder.rename(target)
        else:
            shutil.rmtree(folder, ignore_errors=True)
    for folder in beside:
        if folder.name.startswith(_unfinished(target)) and not folder.is_symlink():
            shutil.rmtree(folder, ignore_errors=True)


def _unfinished(target: Path) -> str:
    """First part of the name of a folder that is being filled."""
    return f".{target.name}.partial-"


def _aside(target: Path) -> str:
    """First part of the name of a result that has stepped aside for another."""
    return f".{target.name}.replaced-"
