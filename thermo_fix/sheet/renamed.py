"""Keys of the sheet that have been renamed: the old name is read for a version, with a note.

``docs/compatibility.md`` says for how long. To rename a key, change it in the schema and the
documentation and add a line to ``RENAMED``; to end the time of the old name, remove the line.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field

from thermo_fix.sheet.lines import KeyPath


@dataclass(frozen=True, slots=True)
class Renamed:
    """One key that has a new name."""

    tables: tuple[str, ...]
    """Where it stands, such as ``("scene", "image", "image.zone")``; ``""`` for the top level."""
    old: str
    new: str
    since: str
    """Version of the program that brought the new name."""
    until: str
    """Version of the program that no longer reads the old one."""


RENAMED: tuple[Renamed, ...] = ()


@dataclass(slots=True)
class Renewal:
    """A sheet with the new names in place of the old ones."""

    sheet: dict[str, object]
    old_keys: dict[KeyPath, str] = field(default_factory=dict)
    """By path with the new names: what stands in the sheet instead of the last step."""
    doubled: list[tuple[KeyPath, str]] = field(default_factory=list)
    """Paths of old names whose new name stands beside them, and the new name."""
    notes: tuple[str, ...] = ()


def renewed(sheet: dict[str, object], table: Sequence[Renamed] | None = None) -> Renewal:
    """Give the keys of a sheet their new names.

    Parameters
    ----------
    sheet
        As parsed; it is not changed.
    table
        Renamed keys; ``RENAMED`` where None.

    Returns
    -------
    Renewal
        With one note for each old name, however often it stands in the sheet.

    """
    table = RENAMED if table is None else table
    result = Renewal(sheet)
    if not table:
        return result
    notes: dict[str, None] = {}

    def walk(value: object, path: KeyPath) -> object:
        if isinstance(value, list):
            return [walk(each, (*path, place)) for place, each in enumerate(value)]
        if not isinstance(value, dict):
            return value
        here = ".".join(step for step in path if isinstance(step, str))
        names = {each.old: each for each in table if here in each.tables}
        fresh: dict[str, object] = {}
        for key, inner in value.items():
            entry = names.get(key)
            if entry is None:
                fresh[key] = walk(inner, (*path, key))
            elif entry.new in value:
                result.doubled.append(((*path, key), entry.new))
            else:
                result.old_keys[(*path, entry.new)] = key
                fresh[entry.new] = walk(inner, (*path, entry.new))
                notes[_note(entry)] = None
        return fresh

    fresh = walk(sheet, ())
    assert isinstance(fresh, dict)  # as the sheet is
    result.sheet = fresh
    result.notes = tuple(notes)
    return result


def _note(entry: Renamed) -> str:
    return (
        f'The key "{entry.old}" of the sheet is called "{entry.new}" since version {entry.since}; '
        f"the old name is read until version {entry.until}: rename it."
    )
