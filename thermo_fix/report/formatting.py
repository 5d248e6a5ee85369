"""How numbers, dates and places are written in the report.

A value that has an uncertainty is rounded to the place of the second significant digit of the
uncertainty beside it (JCGM 100:2008, 7.2.6). Unrounded numbers stand in the machine-readable
results; nothing here changes them.
"""

import math
from dataclasses import dataclass
from datetime import date, datetime
from decimal import ROUND_HALF_EVEN, Decimal
from typing import Final

from thermo_fix.records import TemperatureUnit

COVERAGE: Final = 2.0
"""Coverage factor k of every expanded uncertainty in the report (JCGM 100:2008, 6.3.3)."""

FAHRENHEIT_PER_KELVIN: Final = 1.8
"""Exact, by definition of the degree Fahrenheit (NIST SP 811, B.8)."""

FAHRENHEIT_ZERO_OFFSET: Final = 32.0
"""degF at 0 degC, exact (NIST SP 811, B.8)."""

MINUS: Final = "\N{MINUS SIGN}"
PLUS_MINUS: Final = "\N{PLUS-MINUS SIGN}"
NO_BREAK: Final = "\N{NO-BREAK SPACE}"
DEGREE: Final = "\N{DEGREE SIGN}"

_UNIT_SIGNS: Final = {
    "1": "",
    "deg": DEGREE,
    "degC": f"{DEGREE}C",
    "C": f"{DEGREE}C",
    "degree": DEGREE,
    "um": "µm",
    "m2": "m²",
    "W/m2": "W/m²",
    "W m-2": "W/m²",
    "W m-2 K-1": "W/(m² K)",
}


@dataclass(frozen=True, slots=True)
class Measured:
    """A value ready to be printed, with its uncertainty if that is known."""

    value: str
    unit: str
    uncertainty: str | None
    """Same rounding as ``value``."""
    uncertainty_unit: str

    @property
    def plain(self) -> str:
        """Value and unit only."""
        return with_unit(self.value, self.unit)

    @property
    def spread(self) -> str | None:
        """The uncertainty with its sign and unit, if known."""
        if self.uncertainty is None:
            return None
        return f"{PLUS_MINUS}{NO_BREAK}{with_unit(self.uncertainty, self.uncertainty_unit)}"

    @property
    def text(self) -> str:
        """Value, unit and uncertainty in one line."""
        return self.plain if self.spread is None else f"{self.plain}{NO_BREAK}{self.spread}"


_CELSIUS_UNITS: Final = frozenset({"degC", "C", f"{DEGREE}C"})


def with_unit(number: str, unit: str) -> str:
    """Join a number and its unit with a space that does not break (none before a degree sign)."""
    if not unit:
        return number
    return f"{number}{unit}" if unit == DEGREE else f"{number}{NO_BREAK}{unit}"


def unit_sign(unit: str) -> str:
    """Sign of a unit that the records write in plain letters."""
    return _UNIT_SIGNS.get(unit, unit)


def fixed(value: float, decimals: int, *, sign: bool = False) -> str:
    """Write ``value`` with ``decimals`` places (negative: rounded to tens, hundreds, ...).

    A value that rounds to zero carries no sign.
    """
    number = Decimal(repr(float(value)))
    rounded = number.quantize(Decimal(1).scaleb(-decimals), rounding=ROUND_HALF_EVEN)
    digits = f"{abs(rounded):f}"
    if rounded == 0:
        return digits
    if rounded < 0:
        return MINUS + digits
    return f"+{digits}" if sign else digits


def significant_place(uncertainty: float) -> int:
    """Decimals at which an uncertainty has two significant digits.

    The uncertainty is positive and finite. 0.0996 has 2 (it rounds to 0.10), 0.0994 has 3.
    """
    decimals = 1 - math.floor(math.log10(uncertainty))
    rounded = float(Decimal(repr(uncertainty)).quantize(Decimal(1).scaleb(-decimals)))
    return 1 - math.floor(math.log10(rounded))


def known(value: float | None) -> bool:
    """Whether there is a finite number to print."""
    return value is not None and math.isfinite(value)


def measured(
    value: float,
    uncertainty: float | None,
    unit: str,
    *,
    uncertainty_unit: str | None = None,
    decimals: int = 1,
    sign: bool = False,
) -> Measured:
    """Round a value to its uncertainty; without one, to ``decimals`` places."""
    spread: str | None = None
    if uncertainty is not None and math.isfinite(uncertainty) and uncertainty > 0.0:
        decimals = significant_place(uncertainty)
        spread = fixed(uncertainty, decimals)
    return Measured(
        value=fixed(value, decimals, sign=sign),
        unit=unit,
        uncertainty=spread,
        uncertainty_unit=unit if uncertainty_unit is None else uncertainty_unit,
    )


def shortest(value: float, digits: int = 6) -> str:
    """Write an input as a person would have typed it: up to ``digits`` significant digits."""
    text = f"{Decimal(f'{value:.{digits}g}'):f}"
    if "." in text:
        text = text.rstrip("0").rstrip(".")
    return text.replace("-", MINUS)


@dataclass(frozen=True, slots=True)
class Units:
    """Temperatures in the unit that the survey asks for."""

    temperature_unit: TemperatureUnit = "celsius"
    decimal_mark: str = "."

    def number(self, text: str) -> str:
        """A written number with the decimal mark of the language."""
        return text if self.decimal_mark == "." else text.replace(".", self.decimal_mark)

    def fixed(self, value: float, decimals: int) -> str:
        """As the function ``fixed``."""
        return self.number(fixed(value, decimals))

    def shortest(self, value: float, digits: int = 6) -> str:
        """As the function ``shortest``."""
        return self.number(shortest(value, digits))

    def measured(
        self,
        value: float,
        uncertainty: float | None,
        unit: str,
        *,
        uncertainty_unit: str | None = None,
        decimals: int = 1,
        sign: bool = False,
    ) -> Measured:
        """As the function ``measured``."""
        both = measured(
            value,
            uncertainty,
            unit,
            uncertainty_unit=uncertainty_unit,
            decimals=decimals,
            sign=sign,
        )
        spread = both.uncertainty
        return Measured(
            self.number(both.value),
            both.unit,
            None if spread is None else self.number(spread),
            both.uncertainty_unit,
        )

    @property
    def fahrenheit(self) -> bool:
        """Whether temperatures are printed in degF."""
        return self.temperature_unit == "fahrenheit"

    @property
    def sign(self) -> str:
        """Sign of the temperature unit."""
        return f"{DEGREE}F" if self.fahrenheit else f"{DEGREE}C"

    @property
    def difference_sign(self) -> str:
        """Sign of the unit of temperature differences."""
        return f"{DEGREE}F" if self.fahrenheit else "K"

    @staticmethod
    def is_celsius(unit: str) -> bool:
        """Whether the records mean degC by a unit."""
        return unit in _CELSIUS_UNITS

    def from_celsius(self, value_c: float) -> float:
        """A temperature in the printed unit."""
        if self.fahrenheit:
            return value_c * FAHRENHEIT_PER_KELVIN + FAHRENHEIT_ZERO_OFFSET
        return value_c

    def from_kelvin_difference(self, value_k: float) -> float:
        """A difference in the printed unit."""
        return value_k * FAHRENHEIT_PER_KELVIN if self.fahrenheit else value_k

    def temperature(self, value_c: float | None, u_k: float | None = None) -> Measured | None:
        """A temperature with its expanded uncertainty (k = 2); ``u_k`` is the standard one."""
        if value_c is None or not math.isfinite(value_c):
            return None
        return self.measured(
            self.from_celsius(value_c),
            None if u_k is None else self.from_kelvin_difference(COVERAGE * u_k),
            self.sign,
            uncertainty_unit=self.difference_sign,
        )

    def difference(
        self, value_k: float | None, u_k: float | None = None, *, sign: bool = True
    ) -> Measured | None:
        """A difference with its expanded uncertainty (k = 2); ``u_k`` is the standard one."""
        if value_k is None or not math.isfinite(value_k):
            return None
        return self.measured(
            self.from_kelvin_difference(value_k),
            None if u_k is None else self.from_kelvin_difference(COVERAGE * u_k),
            self.difference_sign,
            sign=sign,
        )

    def input_and_u(self, value: float | None, u: float | None, unit: str) -> tuple[str, str]:
        """An input and its standard uncertainty (k = 1) in printed units; empty if not known."""
        celsius = self.is_celsius(unit)
        spread = u if known(u) and u else None
        sign = u_sign = unit_sign(unit)
        if unit == "K" or celsius:
            spread = None if spread is None else self.from_kelvin_difference(spread)
            u_sign = self.difference_sign
            sign = self.sign if celsius else u_sign
        if value is None or not known(value):
            text = "" if spread is None else self.measured(0.0, spread, sign).uncertainty or ""
            return "", with_unit(text, u_sign) if text else ""
        if celsius:
            value = self.from_celsius(value)
        elif unit == "K":
            value = self.from_kelvin_difference(value)
        if spread is None:
            return with_unit(self.shortest(value, 5), sign), ""
        both = self.measured(value, spread, sign, uncertainty_unit=u_sign)
        return both.plain, with_unit(both.uncertainty or "", u_sign)

    def standard_uncertainty(self, u_k: float | None) -> str | None:
        """A standard uncertainty (k = 1) of a temperature, two significant digits."""
        if u_k is None or not math.isfinite(u_k) or u_k < 0.0:
            return None
        value = self.from_kelvin_difference(u_k)
        decimals = significant_place(value) if value > 0.0 else 1
        return with_unit(self.fixed(value, min(decimals, 3)), self.difference_sign)


def percent(probability: float) -> str:
    """A probability in whole per cent; never a bare 0 or 100, which would claim certainty."""
    if probability < 0.01:
        return f"<{NO_BREAK}1{NO_BREAK}%"
    if probability > 0.99:
        return f">{NO_BREAK}99{NO_BREAK}%"
    return f"{fixed(100.0 * probability, 0)}{NO_BREAK}%"


def iso(moment: date | datetime) -> str:
    """A date, or a date and time to the second, in ISO 8601 (a space instead of the T)."""
    if isinstance(moment, datetime):
        return moment.isoformat(sep=" ", timespec="seconds")
    return moment.isoformat()
