"""Constants of nature and of convention, each once and with its source."""

from typing import Final

STEFAN_BOLTZMANN: Final = 5.670374419e-8
"""W m-2 K-4. CODATA 2018 and 2022 (exact in the SI of 2019; truncated to ten digits)."""

PLANCK: Final = 6.62607015e-34
"""J s. SI 2019, exact."""

LIGHT_SPEED: Final = 299_792_458.0
"""m/s. SI 2019, exact."""

BOLTZMANN: Final = 1.380649e-23
"""J/K. SI 2019, exact."""

ZERO_CELSIUS_K: Final = 273.15
"""K. Definition of the Celsius temperature (SI brochure, 9th edition, 2.3.1)."""

WATER_VAPOUR_GAS_CONSTANT: Final = 461.523
"""J kg-1 K-1. Molar gas constant 8.314462618 J/(mol K) over 18.015268 g/mol (IAPWS-95)."""

STANDARD_GRAVITY: Final = 9.80665
"""m/s2. Standard acceleration of free fall, by convention (CGPM 1901)."""

STANDARD_PRESSURE: Final = 101_325.0
"""Pa. Standard atmosphere (ISO 2533)."""
