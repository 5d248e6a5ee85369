"""Uncertainty: named variables, their propagation, and the measurement equation.

``variables`` what an input is worth and how it may be drawn; ``propagation`` JCGM 100 and JCGM
101; ``equation`` the surface temperature as a function of a reading and its named inputs.
Pure functions on floats and arrays.
"""
