"""Drawn stand-ins for the ordinary photographs of the building demo. Nothing is photographed."""

from pathlib import Path
from typing import Any, Final

import cv2
import numpy as np
from numpy.typing import NDArray

HEIGHT: Final = 360
WIDTH: Final = 480
Picture = NDArray[np.uint8]
Colour = tuple[int, int, int]

INK: Final[Colour] = (70, 62, 58)
BRICK: Final[Colour] = (96, 116, 178)
MORTAR: Final[Colour] = (176, 190, 200)
SKY: Final[Colour] = (226, 206, 176)
WALL: Final[Colour] = (214, 222, 228)
WALL_SHADE: Final[Colour] = (196, 206, 214)
CEILING: Final[Colour] = (238, 240, 242)
FLOOR: Final[Colour] = (120, 146, 168)


def _blank(colour: Colour) -> Picture:
    return np.full((HEIGHT, WIDTH, 3), colour, dtype=np.uint8)


def _caption(picture: Picture) -> None:
    cv2.putText(
        picture,
        "drawing, not a photograph",
        (12, HEIGHT - 12),
        cv2.FONT_HERSHEY_SIMPLEX,
        0.5,
        INK,
        1,
    )


def brick_bay() -> Picture:
    """The north wall of the long shed: a bay between two piers, under the eaves."""
    picture = _blank(BRICK)
    for row, y in enumerate(range(40, HEIGHT, 14)):
        cv2.line(picture, (0, y), (WIDTH, y), MORTAR, 1)
        for x in range(-18 * (row % 2), WIDTH, 36):
            cv2.line(picture, (x, y), (x, y + 14), MORTAR, 1)
    cv2.rectangle(picture, (0, 0), (WIDTH, 26), SKY, -1)
    cv2.rectangle(picture, (0, 26), (WIDTH, 40), INK, -1)
    for x in (150, 330):
        cv2.rectangle(picture, (x, 40), (x + 22, HEIGHT), (84, 102, 160), -1)
        cv2.rectangle(picture, (x, 40), (x + 22, HEIGHT), INK, 1)
    cv2.rectangle(picture, (0, HEIGHT - 30), (WIDTH, HEIGHT), MORTAR, -1)
    _caption(picture)
    return picture


def room_corner() -> Picture:
    """The north-east corner of the hall: ceiling, two walls, a picture rail."""
    picture = _blank(WALL)
    corner = (225, 94)
    left = [(0, 30), corner, (225, HEIGHT), (0, HEIGHT)]
    ceiling = [(0, 0), (WIDTH, 0), (WIDTH, 40), corner, (0, 30)]
    _fill(picture, left, WALL_SHADE)
    _fill(picture, ceiling, CEILING)
    cv2.line(picture, corner, (225, HEIGHT), INK, 2)
    cv2.line(picture, (0, 30), corner, INK, 2)
    cv2.line(picture, corner, (WIDTH, 40), INK, 2)
    cv2.line(picture, (0, 150), (225, 176), INK, 1)
    cv2.line(picture, (225, 176), (WIDTH, 148), INK, 1)
    _fill(
        picture,
        [(0, HEIGHT - 8), (225, HEIGHT - 50), (WIDTH, HEIGHT - 12), (WIDTH, HEIGHT), (0, HEIGHT)],
        FLOOR,
    )
    _caption(picture)
    return picture


def _fill(picture: Picture, corners: list[tuple[int, int]], colour: Colour) -> None:
    points: NDArray[Any] = np.array(corners, dtype=np.int32)
    cv2.fillPoly(picture, [points], colour)


def write_pictures(folder: Path) -> None:
    """Write the two drawings of the building demo as PNG."""
    for name, picture in (("VIS_0101.png", brick_bay()), ("VIS_0104.png", room_corner())):
        done, encoded = cv2.imencode(".png", picture, [cv2.IMWRITE_PNG_COMPRESSION, 9])
        if not done:
            raise OSError(f"cannot encode {name}")
        (folder / name).write_bytes(encoded.tobytes())
