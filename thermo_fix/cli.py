"""The command line: options, progress, exit status. It holds no physics.

Exit status: 0 all done; 1 some images failed; 2 the survey could not be run.
"""

import io
import os
import shlex
import shutil
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Literal, NoReturn

import typer

from thermo_fix.errors import SheetError, ThermoFixError, one_line, reason_of
from thermo_fix.solve_cli import solve
from thermo_fix.terminal import problem, say, several_lines, trace
from thermo_fix.text_file import write_text_file
from thermo_fix.version import __version__

if TYPE_CHECKING:
    from thermo_fix.report.pdf import Paper
    from thermo_fix.sheet import FileFacts
    from thermo_fix.survey import RunOptions

# Imaging and plotting libraries are imported inside the commands that need them, so that --help
# and point answer at once.

EXIT_DONE = 0
EXIT_SOME_FAILED = 1
EXIT_NOT_RUN = 2

_INTERRUPTED = 130
"""What the library of the command line makes of Ctrl-C: 128 + SIGINT, as shells do."""

app = typer.Typer(
    name="thermo-fix",
    help=(
        "From a folder of radiometric infrared images to a report of corrected, graded findings "
        "with their uncertainty.\n\n"
        "A first survey:  thermo-fix draft FOLDER  writes FOLDER/survey.toml; fill it in;  "
        "thermo-fix vet FOLDER  checks it;  thermo-fix run FOLDER  writes FOLDER/results with "
        "report.html.  thermo-fix demo  shows all of it on an invented survey."
    ),
    no_args_is_help=True,
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)
app.add_typer(solve)

Folder = Annotated[
    Path, typer.Argument(help="The survey folder: images, and survey.toml if there is one.")
]


class _Settings:
    """What was asked for ahead of the command."""

    debug = False


@app.callback(invoke_without_command=True)
def _root(
    version: Annotated[bool, typer.Option("--version", help="Print the version.")] = False,
    debug: Annotated[
        bool, typer.Option("--debug", help="When something fails, show where in the program.")
    ] = False,
) -> None:
    _Settings.debug = debug
    if version:
        say(f"thermo_fix {__version__}")
        raise typer.Exit


@app.command()
def run(
    folder: Folder,
    out: Annotated[
        Path | None,
        typer.Option(help="Results folder; FOLDER/results if not given. Replaced as a whole."),
    ] = None,
    quiet: Annotated[bool, typer.Option("--quiet", "-q", help="Print problems only.")] = False,
    jobs: Annotated[
        int | None,
        typer.Option(min=1, help="Worker processes; one for each core if not given."),
    ] = None,
    cluster: Annotated[
        str | None,
        typer.Option(help="Address of a Dask scheduler, to use its workers instead."),
    ] = None,
    fresh: Annotated[
        bool,
        typer.Option("--fresh", help="Compute every image again, also those that did not change."),
    ] = False,
    no_planes: Annotated[
        bool, typer.Option("--no-planes", help="Leave out corrected/ and uncertainty/.")
    ] = False,
    no_pictures: Annotated[
        bool, typer.Option("--no-pictures", help="Leave the pictures out of the report.")
    ] = False,
    images_per_page: Annotated[
        int,
        typer.Option(min=1, help="Images up to which the report is one file."),
    ] = 60,
    single_file: Annotated[
        bool, typer.Option("--single-file", help="One file, however many images there are.")
    ] = False,
    pdf: Annotated[
        bool, typer.Option("--pdf", help="Print the report to report.pdf with Chromium.")
    ] = False,
    paper: Annotated[
        str | None,
        typer.Option(help="A4 or letter, for --pdf; by default what goes with the report's unit."),
    ] = None,
) -> None:
    """Do the whole job: correct, find, grade, and write the report.

    Images that did not change since the last run are taken over from it, and an interrupted run
    is carried on.

    Exit status: 0 all done; 1 some images failed (named on standard error); 2 the survey could
    not be run and nothing was written.
    """
    from thermo_fix.survey import RunOptions

    options = RunOptions(
        jobs=jobs,
        cluster=cluster,
        fresh=fresh,
        planes=not no_planes,
        pictures=not no_pictures,
        images_per_page=images_per_page,
        single_file=single_file,
        debug=_Settings.debug,
    )
    if paper not in (None, "A4", "letter"):
        _fail(f'--paper {paper}: write "A4" or "letter"')
    raise typer.Exit(_run(folder, out, quiet, options, _paper(paper) if pdf else None))


@app.command()
def draft(
    folder: Folder,
    force: Annotated[
        bool, typer.Option("--force", help="Overwrite a survey.toml that is already there.")
    ] = False,
) -> None:
    """Write a survey sheet for a folder, filled with what can be read from its images."""
    from thermo_fix.sheet import SHEET_NAME, draft_sheet

    if not folder.is_dir():
        _fail(f"{folder}: is no folder; give the folder that holds the images")
    sheet = folder / SHEET_NAME
    if sheet.exists() and not force:
        _fail(f"{sheet}: is already there; move it away, or use --force to overwrite it")
    facts = _facts(folder)
    if not facts:
        _fail(f"{folder}: holds no TIFF image (*.tif, *.tiff); nothing to draft a sheet for")
    text = draft_sheet(folder, facts)
    try:
        write_text_file(sheet, text)
    except OSError as error:
        _fail(f"{sheet}: cannot be written ({reason_of(error)})")
    say(f"{sheet}: drafted for {len(facts)} images. Fill in what is marked, then:")
    say(f"  thermo-fix vet {_quoted(folder)}")


@app.command()
def vet(folder: Folder) -> None:
    """Check a survey sheet and its images; compute and write nothing.

    Exit status: 0 nothing wrong; 1 some images cannot be used; 2 the sheet is wrong.
    """
    from thermo_fix.errors import ImageError, about_file
    from thermo_fix.read import read_frame
    from thermo_fix.sheet import check_polygon
    from thermo_fix.survey import open_survey
    from thermo_fix.work import check_place

    survey = open_survey(folder)
    for note in survey.notes:
        say(f"note: {note}")
    bad = 0
    for job in survey.images:
        try:
            check_place(job, survey)
            frame = read_frame(job.path, survey.camera)
            rows, columns = frame.shape
            messages = [check_polygon(zone, columns, rows) for zone in job.zones]
        except ImageError as error:
            bad += 1
            problem(about_file(job.file, str(error)))
            continue
        for message in [*frame.notes, frame.encoding.note, *messages]:
            if message:
                say(f"note: {job.file}: {message}" if job.file not in message else message)
    good = len(survey.images) - bad
    say(f"{folder}: sheet in order; {good} of {len(survey.images)} images can be used.")
    raise typer.Exit(EXIT_SOME_FAILED if bad else EXIT_DONE)


@app.command(context_settings={"ignore_unknown_options": True})
def point(
    reading_c: Annotated[float, typer.Argument(help="Reading of the camera, degC.")],
    emissivity: Annotated[
        str, typer.Option(help="A number above 0 and at most 1, or a surface such as 'plaster'.")
    ],
    reflected_c: Annotated[
        float | None, typer.Option(help="Reflected apparent temperature, degC; else the air's.")
    ] = None,
    air_c: Annotated[
        float | None, typer.Option(help="Air temperature, degC; 20 is assumed if not given.")
    ] = None,
    humidity: Annotated[
        float | None, typer.Option(help="Relative humidity, 0 to 1; 0.5 is assumed.")
    ] = None,
    distance_m: Annotated[
        float | None, typer.Option(help="Distance, m; without it no air is corrected for.")
    ] = None,
    transmittance: Annotated[
        float | None, typer.Option(help="Air transmittance, instead of the formula.")
    ] = None,
    window_transmittance: Annotated[
        float | None, typer.Option(help="Transmittance of an infrared window in the path.")
    ] = None,
    window_reflectance: Annotated[
        float | None, typer.Option(help="Its reflectance; 0.04 is assumed.")
    ] = None,
    window_c: Annotated[
        float | None, typer.Option(help="Its temperature, degC; that of the air if not given.")
    ] = None,
    window_reflected_c: Annotated[
        float | None, typer.Option(help="Apparent temperature that it mirrors, degC.")
    ] = None,
    model: Annotated[str, typer.Option(help="Radiation model: total or band.")] = "total",
    band_um: Annotated[
        tuple[float, float], typer.Option(help="Band of the camera, um, for the band model.")
    ] = (8.0, 14.0),
    recorded_emissivity: Annotated[
        float, typer.Option(help="Emissivity that the camera had applied.")
    ] = 1.0,
    recorded_reflected_c: Annotated[
        float, typer.Option(help="Reflected temperature that the camera had applied, degC.")
    ] = 20.0,
) -> None:
    """Correct one reading from numbers and print the surface temperature."""
    from thermo_fix.point import correct
    from thermo_fix.surfaces import UnknownSurface

    if model not in ("total", "band"):
        _fail(f'--model {model}: write "total" or "band"')
    value: float | str
    try:
        value = float(emissivity)
    except ValueError:
        value = emissivity
    try:
        result = correct(
            reading_c,
            emissivity=value,
            reflected_c=reflected_c,
            air_c=air_c,
            humidity=humidity,
            distance_m=distance_m,
            transmittance=transmittance,
            window_transmittance=window_transmittance,
            window_reflectance=window_reflectance,
            window_c=window_c,
            window_reflected_c=window_reflected_c,
            model="band" if model == "band" else "total",
            band_um=band_um,
            recorded_emissivity=recorded_emissivity,
            recorded_reflected_c=recorded_reflected_c,
        )
    except UnknownSurface as error:
        _fail(f"--emissivity {emissivity!r}: {error.args[0]}")
    temperature, u = float(result.temperature_c), float(result.u_k)
    if temperature != temperature:  # NaN
        _fail(
            "no surface temperature explains this reading: with these inputs the surroundings "
            "alone would send more than was seen; check emissivity and reflected temperature"
        )
    say(f"surface temperature {temperature:.2f} degC, standard uncertainty {u:.2f} K (k = 1)")
    say(f"95 % interval {temperature - 1.96 * u:.1f} to {temperature + 1.96 * u:.1f} degC")


@app.command()
def demo(
    folder: Annotated[Path, typer.Argument(help="Where to put the demo surveys.")] = Path(
        "thermo_fix_demo"
    ),
) -> None:
    """Copy two invented demo surveys, building and electrical, and run both."""
    from thermo_fix.demo import demo_surveys
    from thermo_fix.survey import RunOptions

    status = EXIT_DONE
    if folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
        _fail(f"{folder}: is already there; give a new or empty folder for the demo")
    for name, source in demo_surveys().items():
        target = folder / name
        shutil.copytree(source, target)
        # The demo has a broken file on purpose, so that a failed image can be seen.
        outcome = _run(target, None, False, RunOptions(jobs=None, debug=_Settings.debug))
        status = max(status, EXIT_DONE if outcome == EXIT_SOME_FAILED else outcome)
    raise typer.Exit(status)


def main() -> NoReturn:
    """Run the command line and leave with its exit status."""
    _Settings.debug = False
    try:
        code = app(standalone_mode=False)
        sys.stdout.flush()
        if code == _INTERRUPTED:
            raise KeyboardInterrupt
        sys.exit(code if isinstance(code, int) else EXIT_DONE)
    except typer.Exit as leave:
        sys.exit(leave.exit_code)
    except BrokenPipeError:
        # The reader of our output has gone, as after "| head": nothing to say to anybody.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        sys.exit(EXIT_DONE)
    except KeyboardInterrupt:
        problem("stopped; finished images are kept, and the same command carries on")
    except Exception as error:
        if _Settings.debug:
            trace(error)
        _explain(error)
    sys.exit(EXIT_NOT_RUN)


def _explain(error: Exception) -> None:
    """Say on standard error what went wrong, one line for each thing to mend."""
    # Usage errors of the command line know how to show themselves.
    show = getattr(error, "show", None)
    if isinstance(error, SheetError):
        for line in error.problems:
            problem(line)
    elif isinstance(error, ThermoFixError):
        problem(str(error))
    elif isinstance(error, typer.Abort):
        problem("stopped")
    elif callable(show):
        text = io.StringIO()
        show(file=text)
        several_lines(text.getvalue())
    elif isinstance(error, OSError):
        where = "" if error.filename is None else f"{os.fsdecode(error.filename)}: "
        problem(f"{where}cannot be used ({reason_of(error)})")
    elif isinstance(error, MemoryError):
        problem("the memory of this computer is not enough; try --jobs 1")
    else:
        name = type(error).__name__
        problem(
            f"a fault of this program ({name}: {error}); please report it with what "
            "thermo-fix --debug and the same command show"
        )


def _paper(name: str | None) -> "Paper | Literal['by unit']":
    return "letter" if name == "letter" else "A4" if name == "A4" else "by unit"


def _run(
    folder: Path,
    out: Path | None,
    quiet: bool,
    options: "RunOptions",
    paper: "Paper | Literal['by unit'] | None" = None,
) -> int:
    from thermo_fix.survey import RESULTS_NAME, run_survey

    target = folder / RESULTS_NAME if out is None else out
    if quiet or not sys.stderr.isatty():
        result = run_survey(folder, out, options=options)
    else:
        from rich.console import Console
        from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn
        from rich.progress import TimeRemainingColumn as Remaining

        columns = (
            TextColumn("{task.description}", markup=False),
            BarColumn(),
            MofNCompleteColumn(),
            Remaining(),
        )
        with Progress(*columns, console=Console(stderr=True), transient=True) as bar:
            task = bar.add_task(one_line(folder.name), total=None)
            result = run_survey(
                folder,
                out,
                options=options,
                progress=lambda done, total, _: bar.update(task, completed=done, total=total),
            )
    for image in result.failed:
        problem(image.error or f"{image.file}: failed")
    if not quiet:
        from thermo_fix.records import GRADES

        for note in result.survey.notes:
            say(f"note: {note}")
        grades = [finding.grade for finding in result.findings]
        counts = ", ".join(f"{grades.count(grade)} {grade}" for grade in reversed(GRADES))
        done = len(result.images) - len(result.failed)
        say(f"{folder}: {done} of {len(result.images)} images done, {len(grades)} findings")
        say(f"  by grade: {counts}, {grades.count(None)} not graded")
        images = sum(bool(image.every_caution) for image in result.images)
        findings = sum(bool(finding.every_caution) for finding in result.findings)
        if images or findings:
            say(f"  cautions: {images} images, {findings} findings; see the report")
        say(f"  report: {target / 'report.html'}")
    if paper is not None:
        from thermo_fix.report.pdf import PrintError, print_pdf

        if paper == "by unit":
            paper = "letter" if result.survey.temperature_unit == "fahrenheit" else "A4"
        try:
            print_pdf(target / "report.html", target / "report.pdf", paper=paper)
        except PrintError as error:
            # The survey is done; that it is not printed is no failure of it.
            problem(str(error))
        else:
            if not quiet:
                say(f"  on paper: {target / 'report.pdf'}")
    return EXIT_SOME_FAILED if result.failed else EXIT_DONE


def _facts(folder: Path) -> "list[FileFacts]":
    from thermo_fix.errors import ImageError, UnclearEncoding
    from thermo_fix.read import list_images, read_frame
    from thermo_fix.records import Camera
    from thermo_fix.sheet import FileFacts

    facts = []
    for file in list_images(folder):
        name = file.as_posix()
        try:
            frame = read_frame(folder / file, Camera())
        except UnclearEncoding as error:
            facts.append(FileFacts(name, 0, 0, note=str(error)))
            continue
        except ImageError as error:
            problem(str(error))
            continue
        rows, columns = frame.shape
        encoding = frame.encoding
        facts.append(
            FileFacts(
                name,
                columns,
                rows,
                frame.taken,
                encoding.unit,
                encoding.scale,
                encoding.offset,
                encoding.origin,
            )
        )
    return facts


def _quoted(path: Path) -> str:
    """Write a path so that a shell takes it as it is."""
    text = str(path)
    quoted = shlex.quote(text)
    if quoted == text or set(text) & set('$`"\\!'):
        return quoted
    return f'"{text}"'  # which every system's shell understands


def _fail(line: str) -> NoReturn:
    problem(line)
    raise typer.Exit(EXIT_NOT_RUN)
