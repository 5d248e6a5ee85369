"""The electrical demo: boards and a motor of the same invented rope works, in the working day."""

from datetime import datetime, timedelta
from typing import Final

import numpy as np

from tests.simulator.camera import Camera, Window
from tests.simulator.demo_scene import LARGE, SMALL, Air, DemoImage, box_polygon, demo_scene
from tests.simulator.records import Scene, Shape, Zone
from tests.simulator.shapes import Canvas, ellipse, grid, rectangle, slow_field, soften

SEED: Final = 4201
PIXEL: Final = "celsius"
CAMERA: Final = Camera(noise_k=0.05, column_noise_k=0.015, offset_k=-0.2)
BROKEN: Final = "IR_0208.tif"

AIR_C: Final = 22.0
HUMIDITY: Final = 0.40
REFLECTED_C: Final = 23.0
PAINT: Final = 0.945
TAPE: Final = 0.955
PLASTIC: Final = 0.945
CABLE: Final = 0.945
BARE_COPPER: Final = 0.20

EXPLAINED: Final = {"IR_0202.tif": [{"zone": "feeder B", "by": "its current"}]}
"""Warmth that is above the threshold and yet no fault."""

SHEET: Final = """\
# The survey sheet: what the camera did not know. Lines that start with # are comments.
# The place is invented, and so is everything measured there.

[survey]
title = "Rope works, Marlhythe: boards and drives under load"
purpose = "electrical"
date = 2026-01-21
temperature_unit = "celsius"

[camera]
pixel = "celsius"             # the files hold apparent temperatures in degC
band_um = [8.0, 14.0]
ifov_mrad = 1.3
noise_k = 0.05
accuracy_k = 2.0              # the maker's statement: 2 K or 2 % of the reading, the larger
accuracy_fraction = 0.02
recorded = { emissivity = 1.0, reflected_c = 20.0, air_c = 20.0, transmittance = 1.0 }

[radiation]
model = "band"                # with bare metal in the survey the band matters

[scene]
# Defaults for all images. Any of these lines may stand in an image or a zone, and wins there.
emissivity = { surface = "paint, oil-based" }   # of the cabinets
reflected_c = { value = 23.0, u = 1.0 }
air_c = { value = 22.0, u = 0.5 }
humidity = { value = 0.40, u = 0.05 }
distance_m = { value = 0.8, u = 0.1 }
view_angle_deg = 0.0
outdoors = false              # true: the wind counts too
# A rise over the air goes with the current to this power: 1.5 to 2, as it is cooled.
load_exponent = { value = 1.75, u = 0.144 }
design_air_c = 35.0           # limits are also checked in the air that the plant is made for

[detect]
warm = true
cold = true                   # a part that carries no current is colder than its like
min_delta_k = 2.0
min_area_px = 9

[criteria]
use = ["neta-like-components", "neta-rise-over-air", "absolute-limit", "house-difference"]

[[image]]
file = "IR_0201.tif"
asset = "intake room, main breaker, load side"
taken = 2026-01-21T10:05:00
note = "lugs taped; load read on the board's own meter, 45 % of the rating"

# Zones with the same `like` word are compared with each other.
[[image.zone]]
name = "lug A"
polygon = [[66, 128], [94, 128], [94, 156], [66, 156]]
like = "lugs"
emissivity = { surface = "electrical tape, vinyl" }
load_a = 45
rated_a = 100

[[image.zone]]
name = "lug B"
polygon = [[146, 128], [174, 128], [174, 156], [146, 156]]
like = "lugs"
emissivity = { surface = "electrical tape, vinyl" }
load_a = 45
rated_a = 100

[[image.zone]]
name = "lug C"
polygon = [[226, 128], [254, 128], [254, 156], [226, 156]]
like = "lugs"
emissivity = { surface = "electrical tape, vinyl" }
load_a = 45
rated_a = 100

[[image.zone]]
name = "conductor A"
polygon = [[72, 156], [88, 156], [88, 240], [72, 240]]
like = "conductors"
limit = "conductor insulation 75"
emissivity = { surface = "pvc, cable insulation" }
load_a = 45
rated_a = 100

[[image.zone]]
name = "conductor B"
polygon = [[152, 156], [168, 156], [168, 240], [152, 240]]
like = "conductors"
limit = "conductor insulation 75"
emissivity = { surface = "pvc, cable insulation" }
load_a = 45
rated_a = 100

[[image.zone]]
name = "conductor C"
polygon = [[232, 156], [248, 156], [248, 240], [232, 240]]
like = "conductors"
limit = "conductor insulation 75"
emissivity = { surface = "pvc, cable insulation" }
load_a = 45
rated_a = 100

[[image]]
file = "IR_0202.tif"
asset = "intake room, feeder to the spinning floor"
taken = 2026-01-21T10:12:00
note = "B carries more current than A and C: warmth goes with the square of it"

[[image.zone]]
name = "feeder A"
polygon = [[60, 0], [84, 0], [84, 240], [60, 240]]
like = "feeders"
emissivity = { surface = "pvc, cable insulation" }
load_a = 62
rated_a = 125

[[image.zone]]
name = "feeder B"
polygon = [[148, 0], [172, 0], [172, 240], [148, 240]]
like = "feeders"
emissivity = { surface = "pvc, cable insulation" }
load_a = 88
rated_a = 125

[[image.zone]]
name = "feeder C"
polygon = [[236, 0], [260, 0], [260, 240], [236, 240]]
like = "feeders"
emissivity = { surface = "pvc, cable insulation" }
load_a = 60
rated_a = 125

[[image]]
file = "IR_0203.tif"
asset = "workshop board, fuse row"
taken = 2026-01-21T10:24:00
note = "no clamp meter at hand: the loads are not told, and the cold one has to speak for itself"

[[image.zone]]
name = "fuse 1"
polygon = [[30, 60], [58, 60], [58, 130], [30, 130]]
like = "fuses"
emissivity = { surface = "plastic, black" }

[[image.zone]]
name = "fuse 2"
polygon = [[80, 60], [108, 60], [108, 130], [80, 130]]
like = "fuses"
emissivity = { surface = "plastic, black" }

[[image.zone]]
name = "fuse 3"
polygon = [[130, 60], [158, 60], [158, 130], [130, 130]]
like = "fuses"
emissivity = { surface = "plastic, black" }

[[image.zone]]
name = "fuse 4"
polygon = [[180, 60], [208, 60], [208, 130], [180, 130]]
like = "fuses"
emissivity = { surface = "plastic, black" }

[[image]]
file = "IR_0204.tif"
asset = "switchgear panel 2, outgoing terminals, seen through the infrared window"
taken = 2026-01-21T10:41:00
note = "panel closed; crystal window kept on, its transmittance from the plate beside it"
distance_m = { value = 0.6, u = 0.1 }
# What the window neither passes nor mirrors it adds as radiation of its own temperature.
window = { transmittance = 0.82, reflectance = 0.06, temperature_c = 24.0, reflected_c = 22.5 }

[[image.zone]]
name = "terminal A"
polygon = [[60, 80], [90, 80], [90, 130], [60, 130]]
like = "terminals"
emissivity = { surface = "electrical tape, vinyl" }
load_a = 210
rated_a = 400

[[image.zone]]
name = "terminal B"
polygon = [[145, 80], [175, 80], [175, 130], [145, 130]]
like = "terminals"
emissivity = { surface = "electrical tape, vinyl" }
load_a = 205
rated_a = 400

[[image.zone]]
name = "terminal C"
polygon = [[230, 80], [260, 80], [260, 130], [230, 130]]
like = "terminals"
emissivity = { surface = "electrical tape, vinyl" }
load_a = 212
rated_a = 400

[[image]]
file = "IR_0205.tif"
asset = "intake room, copper bar, close up"
taken = 2026-01-21T10:55:00
note = "bare copper fills the picture; a strip of tape was put round it while it was isolated"
# Bare metal is a mirror: its reading says little. The tape beside it, at the same temperature,
# says what is true, and `thermo-fix solve emissivity` turns that into the emissivity of the bar.
emissivity = { value = 0.20, u = 0.03 }
reflected_c = { value = 23.0, u = 0.5 }

[[image.zone]]
name = "tape"
role = "tape"
polygon = [[103, 0], [137, 0], [137, 180], [103, 180]]
emissivity = { surface = "electrical tape, vinyl" }

# At the edges of the tape the optics mix bright tape and dull metal.
[[image.zone]]
name = "tape edge, left"
polygon = [[96, 0], [103, 0], [103, 180], [96, 180]]
ignore = true

[[image.zone]]
name = "tape edge, right"
polygon = [[137, 0], [144, 0], [144, 180], [137, 180]]
ignore = true

[[image]]
file = "IR_0206.tif"
asset = "drive 4 of the rope walk, motor terminal box"
taken = 2026-01-21T11:10:00
note = "rope walk half empty: 45 % of the rated current. What is mild now is not at full load"
limit = "termination 90"      # by name; a number in degC from a nameplate will do too

[[image.zone]]
name = "terminal U"
polygon = [[46, 70], [74, 70], [74, 110], [46, 110]]
like = "motor terminals"
emissivity = { surface = "plastic, black" }
load_a = 11.3
rated_a = 25

[[image.zone]]
name = "terminal V"
polygon = [[106, 70], [134, 70], [134, 110], [106, 110]]
like = "motor terminals"
emissivity = { surface = "plastic, black" }
load_a = 11.3
rated_a = 25

[[image.zone]]
name = "terminal W"
polygon = [[166, 70], [194, 70], [194, 110], [166, 110]]
like = "motor terminals"
emissivity = { surface = "plastic, black" }
load_a = 11.3
rated_a = 25

[[image]]
file = "IR_0207.tif"
asset = "community hall, lighting board"
taken = 2026-01-21T11:32:00

[[image.zone]]
name = "pole A"
polygon = [[70, 70], [94, 70], [94, 150], [70, 150]]
like = "poles"
emissivity = { surface = "plastic, black" }
load_a = 14
rated_a = 32

[[image.zone]]
name = "pole B"
polygon = [[140, 70], [164, 70], [164, 150], [140, 150]]
like = "poles"
emissivity = { surface = "plastic, black" }
load_a = 15
rated_a = 32

[[image.zone]]
name = "pole C"
polygon = [[210, 70], [234, 70], [234, 150], [210, 150]]
like = "poles"
emissivity = { surface = "plastic, black" }
load_a = 14
rated_a = 32

[[image]]
file = "IR_0208.tif"
asset = "compressor room, starter"
taken = 2026-01-21T11:45:00
note = "someone exported the colour picture instead of the temperatures"
"""


def images() -> list[DemoImage]:
    """The readable images of the electrical demo, with their truth."""
    first = datetime(2026, 1, 21, 10, 5)
    minutes = (0, 7, 19, 36, 50, 65, 87)
    builders = (
        hot_lug,
        unequal_currents,
        cold_fuse,
        through_window,
        bare_bar,
        motor_box,
        clean_board,
    )
    return [
        DemoImage(
            f"IR_{201 + number:04d}.tif",
            first + timedelta(minutes=minutes[number]),
            build(np.random.default_rng([SEED, 100 + number])),
        )
        for number, build in enumerate(builders)
    ]


def _plate(rng: np.random.Generator, shape: Shape, mean_c: float) -> Canvas:
    return Canvas(mean_c + slow_field(shape, rng, 0.25))


def _scene(
    name: str,
    canvas: Canvas,
    zones: list[Zone],
    distance_m: float = 0.8,
    emissivity: float = PAINT,
    window: Window | None = None,
) -> Scene:
    """A scene whose zones carry their own emissivity, drawn into the map."""
    air = Air(AIR_C, HUMIDITY, distance_m)
    scene = demo_scene(name, canvas, emissivity, REFLECTED_C, air, zones, window)
    for zone in zones:
        if zone.emissivity is not None:
            (x0, y0), (x1, y1) = zone.polygon[0], zone.polygon[2]
            scene.emissivity_map[rectangle(canvas.shape, x0, y0, x1, y1)] = zone.emissivity
    return scene


def _warm_box(canvas: Canvas, box: tuple[float, float, float, float], rise_k: float) -> None:
    canvas.temperature_c[rectangle(canvas.shape, *box)] += rise_k


def hot_lug(rng: np.random.Generator) -> Scene:
    """A loose lug on phase B at 45 % load: hot at the lug, fading along its conductor."""
    canvas = _plate(rng, LARGE, 25.0)
    _warm_box(canvas, (50, 30, 270, 128), 1.1)
    zones = []
    for number, phase in enumerate("ABC"):
        x = 66 + 80 * number
        lug, conductor = (x, 128, x + 28, 156), (x + 6, 156, x + 22, 240)
        _warm_box(canvas, lug, 5.0 + 0.2 * number)
        _warm_box(canvas, conductor, 4.2 + 0.2 * number)
        zones.append(Zone(f"lug {phase}", box_polygon(*lug), "lugs", False, TAPE, 45, 100))
        zones.append(
            Zone(f"conductor {phase}", box_polygon(*conductor), "conductors", False, CABLE, 45, 100)
        )
    y, x_grid = grid(LARGE)
    metal = rectangle(LARGE, 146, 128, 174, 156) | rectangle(LARGE, 152, 156, 168, 240)
    fade = np.exp(-np.maximum(y - 146.0, 0.0) / 30.0) * np.exp(-np.maximum(138.0 - y, 0.0) / 12.0)
    fade = fade * (1.0 - 0.15 * ((x_grid - 160.0) / 14.0) ** 2) * metal
    canvas.plant("loose lug", np.asarray(fade / fade.max(), dtype=float), 24.0)
    zones.sort(key=lambda zone: zone.like != "lugs")
    return _scene("panel", canvas, zones)


def unequal_currents(rng: np.random.Generator) -> Scene:
    """Three sound cables; the rise over the plate is 18 K at 125 A and goes with I squared."""
    canvas = _plate(rng, LARGE, 25.0)
    zones = []
    for number, (phase, load_a) in enumerate((("A", 62.0), ("B", 88.0), ("C", 60.0))):
        box = (60 + 88 * number, 0, 84 + 88 * number, 240)
        _warm_box(canvas, box, 18.0 * (load_a / 125.0) ** 2)
        zones.append(
            Zone(f"feeder {phase}", box_polygon(*box), "feeders", False, CABLE, load_a, 125)
        )
    return _scene("cables", canvas, zones)


def cold_fuse(rng: np.random.Generator) -> Scene:
    """Four fuse holders; the third carries no current."""
    canvas = _plate(rng, SMALL, 24.6)
    zones = []
    for number in range(4):
        box = (30 + 50 * number, 60, 58 + 50 * number, 130)
        _warm_box(canvas, box, (7.4, 7.2, 7.3, 7.6)[number])
        zones.append(Zone(f"fuse {number + 1}", box_polygon(*box), "fuses", False, PLASTIC))
    dead = rectangle(SMALL, 130, 60, 158, 130)
    canvas.plant("fuse without current", soften(dead, 0.0), -6.6)
    return _scene("fuses", canvas, zones)


def through_window(rng: np.random.Generator) -> Scene:
    """Terminals behind an infrared window; C runs hot."""
    canvas = _plate(rng, LARGE, 26.0)
    zones = []
    for number, (phase, load_a) in enumerate((("A", 210), ("B", 205), ("C", 212))):
        box = (60 + 85 * number, 80, 90 + 85 * number, 130)
        _warm_box(canvas, box, (6.4, 6.1, 6.5)[number])
        zones.append(
            Zone(f"terminal {phase}", box_polygon(*box), "terminals", False, TAPE, load_a, 400)
        )
    joint = soften(ellipse(LARGE, 245.0, 100.0, 12.0, 14.0), 1.2)
    canvas.plant("hot terminal", joint * rectangle(LARGE, 230, 80, 260, 130), 12.0)
    return _scene("panel", canvas, zones, 0.6, window=Window(0.82, 0.06, 24.0, 22.5))


def bare_bar(rng: np.random.Generator) -> Scene:
    """Bare copper and a strip of tape at the same temperature: 48 degC, a little more at left."""
    _, x = grid(SMALL)
    field = 48.0 + 0.5 * (120.0 - x) / 120.0 + np.zeros(SMALL)
    scene = _scene("busbar", Canvas(np.asarray(field, dtype=float)), [], 0.8, BARE_COPPER)
    scene.emissivity_map[rectangle(SMALL, 100, 0, 140, 180)] = TAPE
    scene.zones = [
        Zone("tape", box_polygon(103, 0, 137, 180), emissivity=TAPE, role="tape"),
        Zone("tape edge, left", box_polygon(96, 0, 103, 180), ignore=True),
        Zone("tape edge, right", box_polygon(137, 0, 144, 180), ignore=True),
    ]
    return scene


def motor_box(rng: np.random.Generator) -> Scene:
    """Three terminals at 45 % load; W is warmer by a little more than 4 K."""
    canvas = _plate(rng, SMALL, 30.0)
    zones = []
    for number, terminal in enumerate("UVW"):
        box = (46 + 60 * number, 70, 74 + 60 * number, 110)
        _warm_box(canvas, box, (5.1, 5.3, 5.2)[number])
        zones.append(
            Zone(
                f"terminal {terminal}",
                box_polygon(*box),
                "motor terminals",
                False,
                PLASTIC,
                11.3,
                25,
            )
        )
    warm = soften(ellipse(SMALL, 180.0, 88.0, 11.0, 13.0), 1.2)
    canvas.plant("warm terminal", warm * rectangle(SMALL, 166, 70, 194, 110), 4.4)
    return _scene("panel", canvas, zones)


def clean_board(rng: np.random.Generator) -> Scene:
    """Three poles of a lighting board, equally warm: nothing to report."""
    canvas = _plate(rng, LARGE, 24.5)
    zones = []
    for number, (pole, load_a) in enumerate((("A", 14), ("B", 15), ("C", 14))):
        box = (70 + 70 * number, 70, 94 + 70 * number, 150)
        _warm_box(canvas, box, (5.0, 5.4, 5.1)[number])
        zones.append(Zone(f"pole {pole}", box_polygon(*box), "poles", False, PLASTIC, load_a, 32))
    return _scene("panel", canvas, zones)
