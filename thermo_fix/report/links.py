"""Where the links of a page lead, for a report in one file and for one of many."""

from dataclasses import dataclass
from typing import Literal

from thermo_fix.report.view import FindingView

PAGES = "pages"
"""Folder of the pages of a large survey, beside the entry page."""

LIST_LENGTH = 1000
"""Rows of one page of a list."""


@dataclass(frozen=True, slots=True)
class Links:
    """Addresses as seen from one page."""

    place: Literal["whole", "entry", "page"]
    """The only page, the entry page of many, or one in the folder of pages."""
    image_number: int | None = None
    """Of the image that the page shows."""

    def image(self, number: int) -> str:
        """Address of an image's section."""
        if self.place == "whole" or number == self.image_number:
            return f"#image-{number}"
        return self._page(f"{number:04d}.html")

    def finding(self, finding: FindingView) -> str:
        """Address of a finding's section."""
        if self.place == "whole" or finding.image_number == self.image_number:
            return f"#{finding.anchor}"
        return f"{self.image(finding.image_number)}#{finding.anchor}"

    def home(self, anchor: str) -> str:
        """Address of a section of the entry page."""
        return f"#{anchor}" if self.place != "page" else f"../report.html#{anchor}"

    def listing(self, kind: Literal["findings", "images"], number: int) -> str:
        """Address of a page of a list; ``number`` is from 1."""
        return self._page(list_name(kind, number))

    def _page(self, name: str) -> str:
        return f"{PAGES}/{name}" if self.place == "entry" else name


def list_name(kind: str, number: int) -> str:
    """File name of a page of a list."""
    return f"{kind}-{number:03d}.html"
