"""Names of files in a survey sheet: inside the folder, written the same way everywhere."""

import os
from pathlib import Path, PurePosixPath, PureWindowsPath


def name_problem(name: str) -> str | None:
    """Say why a text cannot be the name of a file of the survey; None when it can."""
    if not name.strip():
        return "the name of a file is missing"
    if any(ord(character) < 32 or ord(character) == 127 for character in name):
        return "the name holds a control character (a line break, a tab); rename the file"
    if any(0xD800 <= ord(character) <= 0xDFFF for character in name):
        return "the name is not valid text; rename the file"
    if "\\" in name:
        return "write / between the names of folders, not a backslash"
    if name.startswith("/") or PureWindowsPath(name).drive:
        return "files are named relative to the survey folder; write the name alone"
    parts = PurePosixPath(name).parts
    if ".." in parts:
        return "the file lies outside the survey folder; copy it into the folder"
    if not parts:
        return "this is the survey folder itself; name a file in it"
    if len(name) > 1000 or any(len(part.encode()) > 255 for part in parts):
        return "the name is too long for a file"
    return None


def normal_name(name: str) -> str:
    """Write a name without ``./`` and doubled slashes, so that equal files have equal names."""
    return PurePosixPath(name).as_posix()


def leads_outside(folder: Path, name: str) -> bool:
    """Whether a symbolic link on the way to a file leads out of the survey folder.

    ``folder`` must be resolved. Costs one look per part of the name unless there is a link.
    """
    step = folder
    for part in PurePosixPath(name).parts:
        step = step / part
        try:
            linked = step.is_symlink()
        except OSError:
            return False
        if linked:
            try:
                return not Path(os.path.realpath(folder / name)).is_relative_to(folder)
            except (OSError, RuntimeError):
                return True
    return False
