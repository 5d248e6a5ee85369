"""The folder in which finished images wait until all are done."""

import contextlib
import shutil
from pathlib import Path
from types import TracebackType
from typing import IO, Self

from thermo_fix.errors import FolderError

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
        self._lock: IO[str] | None = None
        try:
            self._take_lock(target)
            if fresh:
                shutil.rmtree(self.folder, ignore_errors=True)
            self.folder.mkdir(exist_ok=True)
        except OSError as error:
            self._release()
            raise FolderError(
                f"{self.folder}: cannot be written ({(error.strerror or 'error').lower()}); "
                "give another --out"
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
        self._lock = self._lock_path.open("a")
        if fcntl is None:
            return
        try:
            # Held by the process: it dies with its owner.
            fcntl.flock(self._lock, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError as error:
            self._lock.close()
            self._lock = None
            raise FolderError(
                f"{target}: another run is at work on these results; wait for it, "
                "or give another --out"
            ) from error

    def _release(self) -> None:
        if self._lock is not None:
            with contextlib.suppress(OSError):
                self._lock_path.unlink()
            self._lock.close()
            self._lock = None
