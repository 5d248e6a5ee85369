"""The folder in which finished images wait until all are done."""

import contextlib
import os
import shutil
from pathlib import Path
from types import TracebackType
from typing import Self

from thermo_fix.errors import FolderError, reason_of

try:
    import fcntl
except ImportError:  # not on every system; there, two runs at once are not noticed
    fcntl = None  # type: ignore[assignment]


class Workshop:
    """A work folder beside the results, kept when a run is interrupted, for one run at a time.

    Parameters
    ----------
    target
        The results folder.
    fresh
        Throw away what an interrupted run has left.

    Raises
    ------
    FolderError
        Another run is at work on the same results, or the folder cannot be written.

    """

    def __init__(self, target: Path, *, fresh: bool = False) -> None:
        self.folder = target.with_name(f".{target.name}.work")
        # Beside the folder, not in it, so that the folder can be thrown away while it is held.
        self._lock_path = target.with_name(f".{target.name}.lock")
        self._lock: int | None = None
        try:
            target.parent.mkdir(parents=True, exist_ok=True)
            self._take_lock(target)
            if self.folder.is_symlink():
                # A link would lead our files to wherever somebody wanted them.
                self.folder.unlink()
            if fresh:
                shutil.rmtree(self.folder, ignore_errors=True)
            self.folder.mkdir(exist_ok=True)
        except OSError as error:
            self._release()
            raise FolderError(
                f"{self.folder}: cannot be written ({reason_of(error)}); give another --out"
            ) from error

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        with contextlib.suppress(OSError):
            # Goes only when it is empty: then there is nothing to take up again.
            self.folder.rmdir()
        self._release()

    def close(self) -> None:
        """Throw away what is left, once the results are in place."""
        shutil.rmtree(self.folder, ignore_errors=True)

    def _take_lock(self, target: Path) -> None:
        while True:
            # A link or a pipe of this name is not followed and not waited for.
            flags = os.O_RDWR | os.O_CREAT | getattr(os, "O_NOFOLLOW", 0)
            self._lock = os.open(self._lock_path, flags | getattr(os, "O_NONBLOCK", 0), 0o666)
            if fcntl is None:
                return
            try:
                # Held by the process: it dies with its owner.
                fcntl.flock(self._lock, fcntl.LOCK_EX | fcntl.LOCK_NB)
            except BlockingIOError as error:
                os.close(self._lock)
                self._lock = None
                raise FolderError(
                    f"{target}: another run is at work on these results; wait for it, "
                    "or give another --out"
                ) from error
            if self._is_in_place(self._lock):
                return
            # The run before us took the file away after we had opened it.
            os.close(self._lock)
            self._lock = None

    def _is_in_place(self, lock: int) -> bool:
        try:
            there = self._lock_path.lstat()
        except FileNotFoundError:
            return False
        return os.path.samestat(there, os.fstat(lock))

    def _release(self) -> None:
        if self._lock is not None:
            with contextlib.suppress(OSError):
                self._lock_path.unlink()
            os.close(self._lock)
            self._lock = None
