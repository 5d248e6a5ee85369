"""Where the demo surveys are."""

from importlib import resources
from pathlib import Path

from thermo_fix.errors import FolderError


def demo_surveys() -> dict[str, Path]:
    """Return the folders of the demo surveys by name.

    They lie inside an installed package, and beside it in a source checkout.

    Raises
    ------
    FolderError
        They are in neither place.

    """
    package = Path(str(resources.files("thermo_fix")))
    for home in (package / "demo_images", package.parent / "demo_images"):
        found = {path.name: path for path in sorted(home.glob("*")) if path.is_dir()}
        if found:
            return found
    raise FolderError("the demo surveys are missing from this installation; install it again")
