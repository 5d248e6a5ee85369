"""The results folder: what a run writes, and what a comparison reads back.

``planes`` corrected temperatures and uncertainties as TIFF; ``document`` the contents of
``findings.json``; ``table`` those of ``findings.csv``; ``staging`` a folder that is complete or
not there.
"""

from thermo_fix.results.document import findings_document, write_document
from thermo_fix.results.planes import read_plane, write_plane
from thermo_fix.results.staging import Staging, recover
from thermo_fix.results.table import write_table

__all__ = [
    "Staging",
    "findings_document",
    "read_plane",
    "recover",
    "write_document",
    "write_plane",
    "write_table",
]
