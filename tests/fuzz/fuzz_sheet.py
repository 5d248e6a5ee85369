"""Coverage-guided fuzzing of what is text: ``python -m tests.fuzz.fuzz_sheet [options]``.

The first byte chooses a survey sheet, a weather log, a response curve or a file of criteria. See
``fuzz_tiff`` for the options. Whatever the bytes, there is a survey or table, or one line for each
mistake.
"""

import sys
import tempfile
from pathlib import Path

import atheris

with atheris.instrument_imports(
    include=["tomllib", "thermo_fix", "csv"], exclude=["thermo_fix.find"]
):
    from thermo_fix.correct import radiation_models
    from thermo_fix.criteria import all_criteria
    from thermo_fix.read.response import read_response
    from thermo_fix.read.weather import read_weather
    from thermo_fix.sheet import load_survey

from tests.hostile.test_text_files import BAD_TABLES
from tests.sheets import EXAMPLE
from tests.test_sheet_mistakes import BAD
from thermo_fix.errors import DomainError, SheetError, SurveyError
from thermo_fix.records import Camera

FOLDER = Path(tempfile.mkdtemp())
KINDS = ("sheet", "weather", "response_file", "file")


def one_input(data: bytes) -> None:
    kind = KINDS[data[0] % len(KINDS)] if data else KINDS[0]
    file = FOLDER / ("survey.toml" if kind == "sheet" else "table.txt")
    file.write_bytes(data[1:])
    try:
        if kind == "sheet":
            load_survey(FOLDER, found_files=["a.tif"])
        elif kind == "weather":
            read_weather(file, 1.0)
        elif kind == "response_file":
            radiation_models("band", Camera(), read_response(file))
        else:
            all_criteria(file)
    except SheetError as error:
        if not all(line.isprintable() for line in error.problems):
            raise AssertionError(error.problems) from error
    except (SurveyError, DomainError) as error:
        if "\n" in str(error):
            raise AssertionError(str(error)) from error
    finally:
        file.unlink()


def seeds(folder: Path) -> None:
    texts = [(0, EXAMPLE.encode()), *((0, sheet.encode()) for sheet, _, _ in BAD.values())]
    texts += [
        (KINDS.index(key), content)
        for key, content, _ in BAD_TABLES.values()
        if len(content) < 9000
    ]
    for number, (kind, content) in enumerate(texts):
        (folder / str(number)).write_bytes(bytes([kind]) + content)


def main() -> None:
    corpus = FOLDER / "corpus"
    corpus.mkdir()
    seeds(corpus)
    atheris.Setup([*sys.argv, "-rss_limit_mb=3000", "-timeout=20", str(corpus)], one_input)
    atheris.Fuzz()


if __name__ == "__main__":
    main()
