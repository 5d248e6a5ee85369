"""Finished images, kept so that a later run computes only what changed.

One ZIP file an image, named by its key: the hash of the image's content, of everything that the
sheet says of it, and of the software version. It is plain data (JSON and PNG), never code, since
a results folder may come from anywhere.
"""

import contextlib
import dataclasses
import datetime as calendar
import hashlib
import json
import secrets
import zipfile
from collections.abc import Iterable, Mapping
from functools import cache
from pathlib import Path
from typing import Any

from pydantic import TypeAdapter

from thermo_fix.errors import FolderError, reason_of
from thermo_fix.records import ImageResult

_EPOCH = (1980, 1, 1, 0, 0, 0)
_RESULT = "result.json"
_MOST_BYTES = 1 << 30


@dataclasses.dataclass(frozen=True, slots=True)
class KeptImage:
    """A finished image as it is kept."""

    result: ImageResult
    files: dict[str, bytes]
    """Everything else by name: pictures and their description, written planes."""


def key_of(parts: Iterable[bytes]) -> str:
    """Return the key of a finished image from everything that it depends on."""
    digest = hashlib.sha256()
    for part in parts:
        # The length keeps two different splits of the same bytes apart.
        digest.update(len(part).to_bytes(8, "big"))
        digest.update(part)
    return digest.hexdigest()[:40]


def canonical(record: Any, base: Path | None = None) -> bytes:
    """Return a record as bytes that are equal for equal records.

    Paths below ``base`` are taken relative to it, so that a survey may be moved.
    """
    return json.dumps(_plain(record, base), separators=(",", ":")).encode()


def keep_image(folder: Path, key: str, kept: KeptImage) -> None:
    """Write a finished image, atomically; the same content gives the same bytes.

    Raises FolderError where it cannot be written.
    """
    path = folder / f"{key}.zip"
    partial = folder / f"{key}.{secrets.token_hex(6)}.partial"
    try:
        with zipfile.ZipFile(partial, "x", zipfile.ZIP_STORED) as archive:
            content = {_RESULT: canonical(kept.result), **kept.files}
            for name in sorted(content):
                archive.writestr(zipfile.ZipInfo(name, _EPOCH), content[name])
        partial.replace(path)
    except OSError as error:
        raise FolderError(f"{folder}: cannot be written ({reason_of(error)})") from error
    finally:
        with contextlib.suppress(OSError):
            partial.unlink(missing_ok=True)


def load_kept(folder: Path, key: str, names: Iterable[str] | None = None) -> KeptImage | None:
    """Read a finished image.

    Parameters
    ----------
    folder, key
        As for :func:`keep_image`.
    names
        Files that are wanted; all of them where None.

    Returns
    -------
    KeptImage or None
        None where it is not there or is damaged: then it is computed again.

    """
    path = folder / f"{key}.zip"
    try:
        with zipfile.ZipFile(path) as archive:
            if sum(each.file_size for each in archive.infolist()) > _MOST_BYTES:
                return None
            result = _adapter().validate_python(json.loads(archive.read(_RESULT)))
            wanted = set(archive.namelist()) - {_RESULT} if names is None else set(names)
            return KeptImage(result, {name: archive.read(name) for name in sorted(wanted)})
    except Exception:
        # Whatever damage makes of it: zlib.error, EOFError, RecursionError, NotImplementedError ..
        return None


@cache
def _adapter() -> TypeAdapter[ImageResult]:
    return TypeAdapter(ImageResult)


def _plain(value: Any, base: Path | None) -> Any:
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {
            each.name: _plain(getattr(value, each.name), base) for each in dataclasses.fields(value)
        }
    if isinstance(value, Mapping):
        return {str(name): _plain(each, base) for name, each in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(each, base) for each in value]
    if isinstance(value, Path):
        inside = base is not None and value.is_relative_to(base)
        return value.relative_to(base).as_posix() if base and inside else value.as_posix()
    if isinstance(value, calendar.date):
        return value.isoformat()
    if value is None or isinstance(value, str | int | float | bool):
        return value
    raise TypeError(f"{type(value).__name__} cannot be kept")
