"""A forward simulator of infrared surveys, with the truth written beside each image.

It is an independent check on the program: it imports nothing of it.
Temperatures are in degrees Celsius at every interface, exitances in W/m2, arrays (rows, columns).

The flow: `buildings` and `electrical` draw scenes -> `camera` (with `spectral` and `air`) makes of
them what a camera would store -> `survey` writes a folder, or hands the arrays over in memory.
"""

from tests.simulator.air import air_transmittance, sky_and_ground_c, water_vapour_g_m3
from tests.simulator.camera import Camera, RecordedSettings, Window, exitance_at_camera, record
from tests.simulator.records import Planted, Scene, SheetInputs, Simulated, Zone
from tests.simulator.scenes import KINDS, build_scene
from tests.simulator.spectral import Detector, Response, detector
from tests.simulator.survey import simulated_images, write_survey

__all__ = [
    "KINDS",
    "Camera",
    "Detector",
    "Planted",
    "RecordedSettings",
    "Response",
    "Scene",
    "SheetInputs",
    "Simulated",
    "Window",
    "Zone",
    "air_transmittance",
    "build_scene",
    "detector",
    "exitance_at_camera",
    "record",
    "simulated_images",
    "sky_and_ground_c",
    "water_vapour_g_m3",
    "write_survey",
]
