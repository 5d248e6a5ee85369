"""The spectral response of a camera, from a two-column CSV."""

import csv
from pathlib import Path

from thermo_fix.errors import SheetError

_MOST_POINTS = 20_000


def read_response(path: Path) -> tuple[tuple[float, float], ...]:
    """Read a response curve.

    Parameters
    ----------
    path
        CSV with wavelength in um and relative response in each line; a heading line is allowed.

    Returns
    -------
    tuple
        Points (um, response), as they stand.

    Raises
    ------
    SheetError
        A file that cannot be read, or a line that is no pair of numbers.

    """
    try:
        lines = list(csv.reader(path.read_text("utf-8-sig").splitlines()[: _MOST_POINTS + 1]))
    except (OSError, UnicodeDecodeError, csv.Error) as error:
        raise SheetError(
            f"{path.name}: the response curve cannot be read ({type(error).__name__}); "
            "give a UTF-8 CSV file with wavelength and response in two columns"
        ) from error
    points = []
    for number, line in enumerate(lines, 1):
        if not any(cell.strip() for cell in line):
            continue
        try:
            wavelength, response = (float(cell) for cell in line)
        except ValueError as error:
            if number == 1:
                continue
            raise SheetError(
                f"{path.name}, line {number}: {','.join(line)!r} is no pair of numbers; write "
                "wavelength in um and response, separated by a comma"
            ) from error
        points.append((wavelength, response))
    return tuple(points)
