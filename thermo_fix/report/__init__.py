"""The report: one self-contained page, worst findings first.

``view`` lists what is printed and the ``*_view`` modules fill it in; ``formatting`` says how
numbers are written, ``drawing`` where lines and labels go; ``pictures`` encodes the images;
``page`` puts everything into the templates. All words are in ``words/``.
"""

from thermo_fix.report.page import write_report
from thermo_fix.report.pictures import (
    COLOUR_MAPS,
    DataPlane,
    Pictures,
    decode_data,
    encode_photo,
    encode_pictures,
)
from thermo_fix.report.view import CriterionText

__all__ = [
    "COLOUR_MAPS",
    "CriterionText",
    "DataPlane",
    "Pictures",
    "decode_data",
    "encode_photo",
    "encode_pictures",
    "write_report",
]
