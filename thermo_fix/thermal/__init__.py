"""Heat in and around a part: what load, wind and like phases say of a temperature rise.

Pure functions on floats and arrays; they import constants, errors and radiometry only.
"""
