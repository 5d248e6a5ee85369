"""Everything that thermo_fix raises on purpose.

::

    ThermoFixError
    ├── DomainError (also ValueError)   a number outside the range of a formula
    ├── SurveyError                     the survey cannot be run; nothing is written
    │   ├── FolderError                 no such folder, nothing to read, not writable
    │   └── SheetError                  the survey sheet is wrong; may carry several lines
    └── ImageError                      one image is lost, the rest of the survey is done
        ├── UnreadableImage             not a TIFF, truncated, an unknown compression
        ├── NotAMeasurement             a picture (palette, RGB), not radiometric
        └── UnclearEncoding             the values could mean more than one temperature

Each message is one line that a user can act on: which file, which key, what is wrong, what to do.
"""

from collections.abc import Sequence


class ThermoFixError(Exception):
    """Base of all errors that the package raises on purpose."""


class DomainError(ThermoFixError, ValueError):
    """A quantity lies outside the range in which a formula holds."""


class SurveyError(ThermoFixError):
    """The survey as a whole cannot be run."""


class FolderError(SurveyError):
    """The survey folder or the output folder cannot be used."""


class SheetError(SurveyError):
    """The survey sheet is wrong.

    ``problems`` holds one line for each thing to mend, in the order of the file.
    """

    def __init__(self, problems: str | Sequence[str]) -> None:
        told = (problems,) if isinstance(problems, str) else tuple(problems)
        self.problems: tuple[str, ...] = tuple(one_line(each) for each in told)
        super().__init__("\n".join(self.problems))


class ImageError(ThermoFixError):
    """One image cannot be used; the others can."""


class UnreadableImage(ImageError):
    """The file is no TIFF, is damaged, or is compressed in a way that is not supported."""


class NotAMeasurement(ImageError):
    """The file is a picture for the eye, without radiometric values."""


class UnclearEncoding(ImageError):
    """The pixel values leave more than one physical meaning; the sheet must state it."""


def one_line(text: str) -> str:
    r"""Return a text from outside as one line in which nothing is hidden.

    A file name or a cell may hold line breaks, terminal commands, marks that turn the direction of
    the text around them, or bytes that are no text; all of these become escapes such as ``\x1b``.
    """
    if text.isprintable():
        return text
    return "".join(
        character
        if character.isprintable()
        else character.encode("unicode_escape", "surrogatepass").decode("ascii")
        for character in text
    )


def reason_of(error: OSError) -> str:
    """Return why the operating system refused something, in a few words."""
    return one_line((error.strerror or "unknown reason").lower())


def about_file(file: str, message: str) -> str:
    """Return a message that begins with the file, below the survey folder, that it is about."""
    name = one_line(file)
    if message.startswith(f"{name}: "):
        return message
    return f"{name}: {message.removeprefix(name.rpartition('/')[2] + ': ')}"
