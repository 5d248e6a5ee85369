"""A results folder that is complete or not there."""

import contextlib
import os
import shutil
import tempfile
from pathlib import Path
from types import TracebackType
from typing import Self

from thermo_fix.errors import FolderError

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
            self.folder = Path(
                tempfile.mkdtemp(prefix=f".{target.name}.partial-", dir=target.parent)
            )
        except OSError as error:
            raise FolderError(
                f"{target.parent}: cannot be written ({(error.strerror or 'error').lower()}); "
                "give another --out"
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
        """Move the results into place.

        Raises
        ------
        FolderError
            They cannot be moved; an older result is then left as it was.

        """
        older = self._target.with_name(f".{self._target.name}.replaced-{self.folder.name[-8:]}")
        try:
            replaces = self._target.exists()
            if replaces:
                self._target.rename(older)
            try:
                self.folder.rename(self._target)
            except OSError:
                if replaces:
                    older.rename(self._target)
                raise
        except OSError as error:
            raise FolderError(
                f"{self._target}: cannot be put into place "
                f"({(error.strerror or 'error').lower()}); close what uses it and run again"
            ) from error
        self._done = True
        with contextlib.suppress(OSError):
            shutil.rmtree(older)
