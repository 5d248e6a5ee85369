"""The spectral response of a camera, from a two-column CSV."""

import csv
from pathlib import Path

from thermo_fix.errors import SheetError
from thermo_fix.read.limits import DEFAULT_LIMITS
from thermo_fix.read.wording import quoted
from thermo_fix.text_file import read_text_file

_MOST_POINTS = 20_000
_WAVELENGTHS_UM = (0.7, 30.0)
"""As for the band of the camera in the sheet."""
_LARGEST = 1e9
"""A relative response in whatever numbers an instrument counts."""


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
    text = read_text_file(
        path, DEFAULT_LIMITS.max_text_bytes, "a response curve", "give fewer points"
    )
    written = text.splitlines()
    if len(written) > _MOST_POINTS:
        raise SheetError(f"{path.name}: more than {_MOST_POINTS} lines; give fewer points")
    try:
        lines = list(csv.reader(written))
    except csv.Error as error:
        raise SheetError(
            f"{path.name}: the response curve is no CSV file ({error}); write wavelength and "
            "response in two columns"
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
                f"{path.name}, line {number}: {quoted(','.join(line))} is no pair of numbers; "
                "write wavelength in um and response, separated by a comma"
            ) from error
        low, high = _WAVELENGTHS_UM
        if not (low <= wavelength <= high and abs(response) <= _LARGEST):
            raise SheetError(
                f"{path.name}, line {number}: {quoted(','.join(line))}: a wavelength lies between "
                f"{low:g} and {high:g} um, and a response is at most {_LARGEST:g}"
            )
        points.append((wavelength, response))
    return tuple(points)
