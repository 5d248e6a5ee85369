"""Radiometry: pure functions on floats and arrays, without any input or output.

``blackbody`` exitance and its inverse; ``path`` the optical path and its inversion; ``air``
transmittance; ``humidity`` dew point and surface humidity; ``surroundings`` sky and ground;
``surface`` directional emissivity and footprint.
"""
