"""Read by every Python process whose path holds this folder: a world that is less kind.

``TEST_NO_NETWORK``: a process that looks for the network ends. ``TEST_REVERSED``: folders are
listed in reverse.
"""

import os
import sys
from typing import Any


class _Reversed:
    """What ``os.scandir`` returns, in reverse."""

    def __init__(self, path: Any) -> None:
        with scandir(path) as entries:
            self._entries = iter(sorted(entries, key=lambda entry: entry.name, reverse=True))

    def __iter__(self) -> Any:
        return self._entries

    def __next__(self) -> Any:
        return next(self._entries)

    def __enter__(self) -> Any:
        return self

    def __exit__(self, *_error: object) -> None:
        pass

    def close(self) -> None:
        pass


def _no_network(event: str, arguments: tuple[Any, ...]) -> None:
    if not event.startswith("socket.") or event in ("socket.__new__", "socket.gethostname"):
        return
    # Processes of one computer may talk by a path in the file system.
    if len(arguments) > 1 and isinstance(arguments[1], str | bytes):
        return
    os.write(2, f"reached for the network: {event} {arguments[1:]}\n".encode())
    os._exit(77)


scandir, listdir = os.scandir, os.listdir
if os.environ.get("TEST_REVERSED"):
    os.scandir = _Reversed  # type: ignore[assignment]
    os.listdir = lambda *path: sorted(listdir(*path), reverse=True)  # type: ignore[assignment]
if os.environ.get("TEST_NO_NETWORK"):
    sys.addaudithook(_no_network)
