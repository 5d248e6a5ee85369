"""The survey sheet: schema, loading, inheritance, zones, drafting.

``load_survey`` turns a folder's ``survey.toml`` into a :class:`~thermo_fix.records.Survey` without
opening an image; ``draft_sheet`` writes a first sheet; ``zone_mask``, ``label_zones``,
``overlap_notes`` and ``check_polygon`` apply its zones to an image of known size.
"""

from thermo_fix.sheet.draft import FileFacts, draft_sheet
from thermo_fix.sheet.load import assumption_notes, load_survey
from thermo_fix.sheet.schema import SHEET_NAME, SHEET_VERSION
from thermo_fix.sheet.zones import check_polygon, label_zones, overlap_notes, zone_mask

__all__ = [
    "SHEET_NAME",
    "SHEET_VERSION",
    "FileFacts",
    "assumption_notes",
    "check_polygon",
    "draft_sheet",
    "label_zones",
    "load_survey",
    "overlap_notes",
    "zone_mask",
]
