"""The building demo: an invented rope works with a community hall, on a frosty morning.

Indoor air 20.5 degC at 50 %, outdoor air -2 degC at 80 %, no cloud. A surface factor of 0.75 then
stands at 14.88 degC, and the dew point of the indoor air is 9.7 degC.
"""

from datetime import datetime, timedelta
from typing import Final

import numpy as np

from tests.simulator.air import sky_and_ground_c
from tests.simulator.buildings import courses
from tests.simulator.camera import Camera, RecordedSettings
from tests.simulator.demo_scene import LARGE, SMALL, Air, DemoImage, box_polygon, demo_scene
from tests.simulator.records import Scene, Shape, Zone
from tests.simulator.shapes import Canvas, ellipse, grid, ragged, rectangle, slow_field, soften
from tests.simulator.spectral import FloatArray

SEED: Final = 4101
PIXEL: Final = "linear"
CAMERA: Final = Camera(
    noise_k=0.05,
    column_noise_k=0.015,
    offset_k=0.2,
    recorded=RecordedSettings(emissivity=0.95, reflected_c=20.0),
)
BROKEN: Final = "IR_0109.tif"

INDOOR_C: Final = 20.5
OUTDOOR_C: Final = -2.0
INDOOR_HUMIDITY: Final = 0.50
OUTDOOR_HUMIDITY: Final = 0.80
GROUND_C: Final = -1.0
BRICK: Final = 0.935
CONCRETE: Final = 0.925
PLASTER: Final = 0.915
EMULSION: Final = 0.925
GLASS: Final = 0.88
FOIL: Final = 0.04

SHEET: Final = """\
# The survey sheet: what the camera did not know. Lines that start with # are comments.
# The place is invented, and so is everything measured there.

[survey]
title = "Rope works hall, Marlhythe: heating-season walk-through"
purpose = "building"
date = 2026-01-20
temperature_unit = "celsius"
weather = "weather.csv"       # log of the works' own mast, in the time of the images

[camera]
pixel = "linear"              # the files hold whole numbers: kelvin = scale * count + offset
scale = 0.01
offset = 0.0
band_um = [8.0, 14.0]         # the wavelengths that the detector sees
ifov_mrad = 1.3               # one pixel covers 1.3 mm at 1 m
noise_k = 0.05
accuracy_k = 2.0              # the maker's statement: 2 K or 2 % of the reading, the larger
accuracy_fraction = 0.02
# What the camera was set to when it turned radiation into temperature. It was never touched.
recorded = { emissivity = 0.95, reflected_c = 20.0, air_c = 20.0, transmittance = 1.0 }

[radiation]
model = "band"                # the band is known, so use it

[scene]
# Defaults for all images. Any of these lines may stand in an image or a zone, and wins there.
# Most of the images are taken inside, so the inside is the default.
emissivity = { surface = "plaster" }
reflected_c = { value = 20.0, u = 1.0 }
air_c = { value = 20.5, u = 0.5 }          # of the air between wall and camera
humidity = { value = 0.50, u = 0.03 }
distance_m = { value = 2.8, u = 0.3 }
view_angle_deg = 0.0
indoor_c = { value = 20.5, u = 0.5 }
# outdoor_c and, for the images outside, wind_m_s are not stated here: the weather log gives them.

[detect]
warm = true                   # heat that escapes, seen from outside
cold = true                   # cold surfaces, seen from inside
min_delta_k = 1.5
min_area_px = 12

[criteria]
use = ["iso13788-surface-factor", "dew-point", "surface-humidity", "house-difference"]

[conditions]
# The report checks these against its rules. The weather log answers for rain, sun and wind.
steady_hours = 30             # heating on without a night setback since the day before yesterday
pressure_difference_pa = 50   # outside minus inside, while the fan ran (IR_0106)

[design]
# The cold day for which moisture is judged: the hall let for an evening, at 60 % humidity.
indoor_c = 20.0
humidity = { value = 0.60, u = 0.02 }
outdoor_c = -5.0
degree_days_k = { value = 2900, u = 200 }   # heating degree days of a year
climate = "Sellow valley, mean of ten heating seasons"

# ---- outside, before sunrise -------------------------------------------------------------------

[[image]]
file = "IR_0101.tif"
asset = "long shed, north wall, bay 3 (Hatchel Lane)"
photo = "VIS_0101.png"
taken = 2026-01-20T06:42:00
note = "heating on since the evening before; no sun on this wall"
emissivity = { surface = "brick, red" }
# A wall half faces the sky. With the air temperature and humidity below this gives the reflected
# apparent temperature; a clear winter sky is far colder than the air.
reflected_c = { sky = { cloud = 0.0, tilt_deg = 90.0, ground_c = -1.0 } }
side = "outside"
air_c = { value = -2.0, u = 0.5 }          # held before the wall; the log's mast is farther away
humidity = { value = 0.80, u = 0.05 }
distance_m = { value = 11.0, u = 0.5 }

[[image]]
file = "IR_0102.tif"
asset = "community hall, east gable, first floor (Tar Kettle Row)"
taken = 2026-01-20T06:49:00
emissivity = { surface = "concrete, rough" }
reflected_c = { sky = { cloud = 0.0, tilt_deg = 90.0, ground_c = -1.0 } }
side = "outside"
air_c = { value = -2.0, u = 0.5 }          # held before the wall; the log's mast is farther away
humidity = { value = 0.80, u = 0.05 }
distance_m = { value = 14.0, u = 0.5 }

[[image]]
file = "IR_0103.tif"
asset = "community hall, street front (Tar Kettle Row)"
taken = 2026-01-20T06:57:00
note = "the panes mirror the sky: what they seem to show is not their temperature"
emissivity = { surface = "brick, red" }
reflected_c = { sky = { cloud = 0.0, tilt_deg = 90.0, ground_c = -1.0 } }
side = "outside"
air_c = { value = -2.0, u = 0.5 }          # held before the wall; the log's mast is farther away
humidity = { value = 0.80, u = 0.05 }
distance_m = { value = 12.0, u = 0.5 }

# Zones are polygons of x, y in pixels from the upper left corner. These are left out.
[[image.zone]]
name = "left window"
polygon = [[32, 62], [88, 62], [88, 148], [32, 148]]
ignore = true

[[image.zone]]
name = "middle window"
polygon = [[132, 62], [188, 62], [188, 148], [132, 148]]
ignore = true

[[image.zone]]
name = "right window"
polygon = [[232, 62], [288, 62], [288, 148], [232, 148]]
ignore = true

# ---- inside ------------------------------------------------------------------------------------

[[image]]
file = "IR_0104.tif"
asset = "hall, north-east corner under the ceiling"
photo = "VIS_0104.png"
taken = 2026-01-20T07:31:00
emissivity = { surface = "paint, emulsion" }
distance_m = { value = 2.6, u = 0.3 }

[[image]]
file = "IR_0105.tif"
asset = "store room, west wall below the gutter"
taken = 2026-01-20T07:38:00
note = "stain visible; moisture meter to follow"

[[image]]
file = "IR_0106.tif"
asset = "hall, ceiling along the ridge beam"
taken = 2026-01-20T07:46:00
note = "pressure fan running, 50 Pa below outside"
distance_m = { value = 4.5, u = 0.5 }

[[image]]
file = "IR_0107.tif"
asset = "hall, south wall between the doors"
taken = 2026-01-20T07:52:00

[[image]]
file = "IR_0108.tif"
asset = "kitchen, outer wall where the cupboard stood"
taken = 2026-01-20T08:04:00
note = "large cold windows behind the camera, so the foil decides"
# Crumpled foil mirrors what the wall mirrors: its reading is the reflected apparent temperature.
reflected_c = { zone = "foil" }
distance_m = { value = 2.2, u = 0.3 }

[[image.zone]]
name = "foil"
role = "foil"
polygon = [[190, 40], [222, 40], [222, 66], [190, 66]]
ignore = true

[[image]]
file = "IR_0109.tif"
asset = "boiler room, flue wall"
taken = 2026-01-20T08:11:00
note = "the card came loose while this one was being written"
"""

WEATHER: Final = """\
time,air_c,humidity,wind_m_s,rain,sun
2026-01-19T06:00,-1.2,0.84,1.8,0,0
2026-01-19T07:00,-1.3,0.84,1.6,0,0
2026-01-19T08:00,-1.0,0.83,1.5,0,0
2026-01-19T09:00,-0.4,0.81,1.4,0,0.2
2026-01-19T10:00,0.3,0.77,1.7,0,0.6
2026-01-19T11:00,1.0,0.73,2.0,0,0.8
2026-01-19T12:00,1.6,0.70,2.2,0,0.9
2026-01-19T13:00,1.9,0.69,2.3,0,0.9
2026-01-19T14:00,1.8,0.69,2.1,0,0.7
2026-01-19T15:00,1.4,0.71,1.9,0,0.3
2026-01-19T16:00,0.7,0.74,1.6,0,0
2026-01-19T17:00,0.2,0.76,1.4,0,0
2026-01-19T18:00,-0.2,0.77,1.3,0,0
2026-01-19T19:00,-0.5,0.78,1.2,0,0
2026-01-19T20:00,-0.8,0.78,1.2,0,0
2026-01-19T21:00,-1.0,0.79,1.1,0,0
2026-01-19T22:00,-1.2,0.79,1.0,0,0
2026-01-19T23:00,-1.4,0.79,1.1,0,0
2026-01-20T00:00,-1.5,0.80,1.0,0,0
2026-01-20T01:00,-1.6,0.80,0.9,0,0
2026-01-20T02:00,-1.7,0.80,1.0,0,0
2026-01-20T03:00,-1.8,0.80,1.1,0,0
2026-01-20T04:00,-1.9,0.80,1.0,0,0
2026-01-20T05:00,-2.0,0.80,0.9,0,0
2026-01-20T06:00,-2.1,0.80,1.0,0,0
2026-01-20T07:00,-2.0,0.80,1.0,0,0
2026-01-20T08:00,-1.9,0.80,1.1,0,0
2026-01-20T09:00,-1.6,0.79,1.3,0,0
2026-01-20T10:00,-0.9,0.77,1.5,0,0.3
"""


def images() -> list[DemoImage]:
    """The readable images of the building demo, with their truth."""
    first = datetime(2026, 1, 20, 6, 42)
    minutes = (0, 7, 15, 49, 56, 64, 70, 82)
    builders = (
        missing_insulation,
        slab_edge,
        windows,
        cold_corner,
        damp_patch,
        leaking_joint,
        clean_wall,
        foil,
    )
    return [
        DemoImage(
            f"IR_{101 + number:04d}.tif",
            first + timedelta(minutes=minutes[number]),
            build(np.random.default_rng([SEED, 100 + number])),
        )
        for number, build in enumerate(builders)
    ]


def broken_image() -> DemoImage:
    """The image that is cut short when it is written."""
    scene = clean_wall(np.random.default_rng([SEED, 199]))
    return DemoImage(BROKEN, datetime(2026, 1, 20, 8, 11), scene)


def _outside(name: str, canvas: Canvas, emissivity: float, distance_m: float) -> Scene:
    reflected_c = sky_and_ground_c(OUTDOOR_C, OUTDOOR_HUMIDITY, 90.0, GROUND_C)
    air = Air(OUTDOOR_C, OUTDOOR_HUMIDITY, distance_m)
    return demo_scene(name, canvas, emissivity, reflected_c, air)


def _inside(
    name: str, canvas: Canvas, emissivity: float, distance_m: float, reflected_c: float = 20.0
) -> Scene:
    air = Air(INDOOR_C, INDOOR_HUMIDITY, distance_m)
    return demo_scene(name, canvas, emissivity, reflected_c, air)


def _brick_wall(rng: np.random.Generator, shape: Shape, mean_c: float) -> FloatArray:
    return mean_c + slow_field(shape, rng, 0.35) + courses(rng, shape, 0.10)


def missing_insulation(rng: np.random.Generator) -> Scene:
    """A bay of a lined brick wall whose lining was never filled, and a smaller slump beside it."""
    canvas = Canvas(_brick_wall(rng, LARGE, -1.2))
    bay = soften(rectangle(LARGE, 142.0, 62.0, 214.0, 150.0), 2.5)
    canvas.plant("missing insulation", bay, 3.2)
    canvas.plant("missing insulation", soften(ragged(LARGE, 62.0, 176.0, 19.0, rng), 1.8), 2.6)
    return _outside("wall_outside", canvas, BRICK, 11.0)


def slab_edge(rng: np.random.Generator) -> Scene:
    """A floor slab that reaches through the wall."""
    canvas = Canvas(-1.4 + slow_field(LARGE, rng, 0.3))
    canvas.plant("slab edge", soften(rectangle(LARGE, 46.0, 116.0, 320.0, 125.0), 1.6), 3.4)
    return _outside("wall_outside", canvas, CONCRETE, 14.0)


def windows(rng: np.random.Generator) -> Scene:
    """Three windows that mirror the sky, and warm air that leaks out above one of them."""
    canvas = Canvas(_brick_wall(rng, LARGE, -1.1))
    panes = [(34 + 100 * number, 64, 86 + 100 * number, 146) for number in range(3)]
    glass = np.zeros(LARGE, dtype=bool)
    for pane in panes:
        glass |= rectangle(LARGE, *pane)
    canvas.temperature_c[glass] = 3.5
    leak = soften(ellipse(LARGE, 166.0, 46.0, 17.0, 6.0), 1.5)
    canvas.plant("warm air at the window head", leak, 3.0)
    scene = _outside("facade", canvas, BRICK, 12.0)
    scene.emissivity_map[glass] = GLASS
    scene.reflected_map_c[glass] = sky_and_ground_c(OUTDOOR_C, OUTDOOR_HUMIDITY, 40.0, GROUND_C)
    scene.zones = [
        Zone(f"{side} window", box_polygon(x0 - 2, y0 - 2, x1 + 2, y1 + 2), ignore=True)
        for side, (x0, y0, x1, y1) in zip(("left", "middle", "right"), panes, strict=True)
    ]
    return scene


def cold_corner(rng: np.random.Generator) -> Scene:
    """Where two outer walls and the ceiling meet: surface factor 0.77, just on the safe side."""
    y, x = grid(LARGE)
    edge_x, ceiling_y = 150.0, 62.0
    along_edge = np.exp(-np.abs(x - edge_x) / 16.0) * (y > ceiling_y)
    along_ceiling = np.exp(-np.abs(y - ceiling_y) / 14.0)
    field = 18.75 + slow_field(LARGE, rng, 0.15) - 0.7 * np.maximum(along_edge, along_ceiling)
    canvas = Canvas(np.asarray(field, dtype=float))
    distance = np.hypot(x - edge_x, 1.2 * (y - ceiling_y))
    spot = np.asarray(np.exp(-((distance / 24.0) ** 1.4)), dtype=float)
    canvas.plant("cold corner", spot / spot.max(), -2.75)
    return _inside("corner", canvas, EMULSION, 2.6)


def damp_patch(rng: np.random.Generator) -> Scene:
    """A wet patch below a leaking gutter: colder by the wet masonry and by drying."""
    y, _ = grid(LARGE)
    canvas = Canvas(18.7 - 0.6 * (y / 240.0) ** 2 + slow_field(LARGE, rng, 0.2))
    canvas.plant("damp patch", soften(ragged(LARGE, 196.0, 118.0, 31.0, rng), 3.0), -4.3)
    return _inside("room_inside", canvas, PLASTER, 2.8)


def leaking_joint(rng: np.random.Generator) -> Scene:
    """Streaks of outdoor air drawn in at the joint of ceiling and beam."""
    y, x = grid(LARGE)
    joint_y = 58.0
    field = 19.1 + slow_field(LARGE, rng, 0.2) - 0.35 * np.exp(-np.abs(y - joint_y) / 5.0)
    canvas = Canvas(np.asarray(field, dtype=float))
    for at_x, half_px, reach_px, lean, delta_k in (
        (70.0, 5.0, 52.0, 0.12, -4.6),
        (158.0, 7.0, 74.0, -0.06, -7.4),
        (248.0, 5.0, 38.0, 0.20, -3.6),
    ):
        below = np.maximum(y - joint_y, 0.0)
        widening = half_px * (1.0 + 0.006 * below)
        across = np.exp(-0.5 * ((x - at_x - lean * below) / widening) ** 2)
        streak = np.where(y >= joint_y, across * np.exp(-((below / reach_px) ** 2)), 0.0)
        canvas.plant("air leakage", full_height(streak), delta_k)
    return _inside("ceiling", canvas, PLASTER, 4.5)


def full_height(streak: FloatArray) -> FloatArray:
    """Give a streak the greatest value 1."""
    return np.asarray(streak / streak.max(), dtype=float)


def clean_wall(rng: np.random.Generator) -> Scene:
    """A sound wall: studs faintly visible, nothing to report."""
    y, x = grid(SMALL)
    studs = 0.35 * np.exp(-0.5 * (((x % 56.0) - 28.0) / 2.5) ** 2)
    field = 18.9 - 0.5 * (y / 180.0) ** 2 - studs + slow_field(SMALL, rng, 0.15)
    return _inside("room_inside", Canvas(np.asarray(field, dtype=float)), PLASTER, 2.8)


def foil(rng: np.random.Generator) -> Scene:
    """A cold spot where a cupboard kept the wall from warming, and a piece of crumpled foil."""
    reflected_c = 17.4
    canvas = Canvas(18.3 + slow_field(LARGE, rng, 0.15))
    canvas.plant("cold spot", soften(ellipse(LARGE, 104.0, 150.0, 42.0, 27.0, 0.2), 4.0), -3.0)
    scene = _inside("room_inside", canvas, PLASTER, 2.2, reflected_c)
    sheet = (190, 40, 222, 66)
    mirror = rectangle(LARGE, *sheet)
    scene.emissivity_map[mirror] = FOIL
    crumples = np.round(rng.normal(0.0, 0.12, LARGE), 3)
    scene.reflected_map_c[mirror] += crumples[mirror]
    scene.zones = [Zone("foil", box_polygon(*sheet), ignore=True, role="foil")]
    return scene
