"""The run: the work for every image, then the report and the results, and nothing else."""

import hashlib
import os
from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import ExitStack
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path, PurePosixPath

from thermo_fix import cautions
from thermo_fix.cluster import cluster_executor
from thermo_fix.correct import radiation_models
from thermo_fix.correct.weather import with_weather
from thermo_fix.criteria import (
    DEFAULT_USE,
    LIMIT_CRITERION,
    Criterion,
    all_criteria,
    load_criteria,
)
from thermo_fix.errors import FolderError, SheetError, reason_of
from thermo_fix.grade import conditions
from thermo_fix.pool import (
    default_jobs,
    map_in_process,
    map_over_executor,
    map_over_pool,
    single_threads,
)
from thermo_fix.read import list_images
from thermo_fix.read.moment import image_moment
from thermo_fix.read.response import read_response
from thermo_fix.read.weather import read_weather
from thermo_fix.records import Survey, SurveyResult
from thermo_fix.report import CriterionText, Pictures, write_report
from thermo_fix.report.archive import pictures_from_files
from thermo_fix.results import (
    Staging,
    findings_document,
    recover,
    write_document,
    write_table,
)
from thermo_fix.results.kept import load_kept
from thermo_fix.results.workshop import Workshop
from thermo_fix.sheet import SHEET_NAME, assumption_notes, load_survey
from thermo_fix.sheet.toml_text import MAX_BYTES
from thermo_fix.work import (
    PLANE_NAMES,
    ImageTask,
    Outcome,
    failed_image,
    files_of,
    plane_path,
    process_image,
)

RESULTS_NAME = "results"
"""Name of the results folder inside the survey folder, where no other is given."""

_WHAT = {"building": "building", "electrical": "electrical installation"}
_LONGEST_NAME = 255
"""Bytes that usual file systems take for a name."""
_WORTH_A_POOL = 24
"""Images from which starting worker processes pays."""

Progress = Callable[[int, int, str], None]
"""Called with the number of images done, the number of all, and the file just done."""


@dataclass(frozen=True, slots=True)
class RunOptions:
    """How a survey is run; none of it changes a number."""

    jobs: int | None = 1
    """Worker processes; None: one for each core, or none for a small survey. More than one needs
    a script that may be imported again (``if __name__ == "__main__":``)."""
    cluster: str | None = None
    """Address of a Dask scheduler, instead of a pool of processes."""
    fresh: bool = False
    """Compute every image again, whatever an earlier run has left."""
    planes: bool = True
    """Write corrected and uncertainty planes."""
    pictures: bool = True
    """Put pictures into the report."""
    images_per_page: int = 60
    """Images up to which the report is one file; beyond, each image has a page of its own."""
    single_file: bool = False
    """One file whatever the number of images."""
    debug: bool = False
    """Show on standard error where in the program an image failed, and stop at a fault of it."""


DEFAULT_OPTIONS = RunOptions()


def open_survey(folder: Path) -> Survey:
    """Load and check the survey of a folder, without reading a pixel.

    Parameters
    ----------
    folder
        The survey folder.

    Raises
    ------
    FolderError, SheetError
        The survey cannot be run.

    """
    if not folder.is_dir():
        what = "is no folder" if folder.exists() else "does not exist"
        raise FolderError(f"{folder}: {what}; give the folder that holds the images")
    found = [path.as_posix() for path in list_images(folder)]
    survey = load_survey(
        folder,
        found_files=found,
        known_criteria=_known_criteria,
        known_settings=_known_settings,
    )
    if survey.weather_file is not None:
        survey = _filled_by_weather(survey, survey.weather_file)
    if survey.criteria:
        return survey
    names = DEFAULT_USE[survey.purpose]
    if survey.purpose == "electrical" and _states_limit(survey):
        names = (*names, LIMIT_CRITERION)
    note = f"The sheet names no criteria; those for a survey of a {_WHAT[survey.purpose]} are used."
    return replace(survey, criteria=names, notes=(*survey.notes, note))


def run_survey(
    folder: Path | str,
    out: Path | str | None = None,
    *,
    options: RunOptions = DEFAULT_OPTIONS,
    progress: Progress | None = None,
) -> SurveyResult:
    """Do the whole job for a folder of radiometric images.

    Parameters
    ----------
    folder
        The survey folder, with or without a sheet.
    out
        Results folder; ``results`` inside the survey folder by default. Written as a whole and
        only when complete; what an interrupted run has finished is taken up again.
    options
        How to run it.
    progress
        Called after each image.

    Returns
    -------
    SurveyResult
        ``failed`` names the images that could not be used.

    Raises
    ------
    FolderError, SheetError
        The survey cannot be run; nothing was written, and an older result is as it was.

    """
    folder = Path(folder)
    try:
        return _run(folder, _target(folder, out), options, progress)
    except BrokenPipeError:
        raise
    except OSError as error:
        # A full disk, a network drive that is gone.
        where = folder if error.filename is None else os.fsdecode(error.filename)
        raise FolderError(f"{where}: cannot be used ({reason_of(error)})") from error


def _target(folder: Path, out: Path | str | None) -> Path:
    if out is not None:
        return Path(out).resolve()
    target = folder / RESULTS_NAME
    if target.is_symlink():
        raise FolderError(f"{target}: is a link; give --out the folder that it leads to")
    return target


def _run(
    folder: Path, target: Path, options: RunOptions, progress: Progress | None
) -> SurveyResult:
    before = _sheet_bytes(folder)
    survey = open_survey(folder)
    _refuse_overlap(survey, target)
    criteria = load_criteria(survey.criteria, survey.criteria_file)
    response_file = survey.camera.response_file
    response = None if response_file is None else read_response(response_file)
    radiation_models(survey.model, survey.camera, response)
    run_time = datetime.now(UTC).isoformat(timespec="seconds")
    sheet = None if survey.sheet is None else _sheet_bytes(folder)
    if sheet != before:
        raise SheetError(f"{SHEET_NAME}: changed while it was read; run again")
    with ExitStack() as stack:
        workshop = stack.enter_context(Workshop(target, fresh=options.fresh))
        recover(target)
        staging = stack.enter_context(Staging(target))
        older = target if target.is_dir() and not options.fresh else None
        tasks = _tasks(survey, criteria, response, workshop.folder, older, options)
        total = len(survey.images)
        outcomes: list[tuple[ImageTask, Outcome]] = []
        for task, outcome in _outcomes(tasks, total, options):
            outcomes.append((task, outcome))
            if progress is not None:
                progress(len(outcomes), total, task.job.file)
        result = SurveyResult(
            survey=survey,
            images=tuple(outcome.result for _, outcome in outcomes),
            conditions=conditions(
                survey, [finding for _, done in outcomes for finding in done.result.findings]
            ),
            cautions=cautions.general(survey.purpose),
        )
        document = findings_document(
            result,
            run_time=run_time,
            sheet_sha256=None if sheet is None else hashlib.sha256(sheet).hexdigest(),
        )
        write_document(staging.folder / "findings.json", document)
        write_table(staging.folder / "findings.csv", result)
        keys = {task.job.file: outcome.key for task, outcome in outcomes if outcome.key}
        write_report(
            result,
            _KeptPictures(workshop.folder, keys if options.pictures else {}),
            staging.folder / "report.html",
            sheet_text=None if sheet is None else sheet.decode("utf-8-sig"),
            run_time=run_time,
            criteria=[criterion_text(each) for each in criteria],
            images_per_page=options.images_per_page,
            single_file=options.single_file,
        )
        _collect(outcomes, workshop.folder, staging.folder, options)
        staging.finish()
        workshop.close()
    return result


def _sheet_bytes(folder: Path) -> bytes | None:
    """Return the sheet as it stands; None where there is none that could be read."""
    file = folder / SHEET_NAME
    if not file.is_file() or file.stat().st_size > MAX_BYTES:
        return None
    return file.read_bytes()


def _refuse_overlap(survey: Survey, target: Path) -> None:
    """Refuse a results folder that holds what the survey is made of: it would be replaced."""
    folder, place = survey.folder.resolve(), target.resolve()
    advice = "and results replace a folder as a whole; give another --out"
    if folder.is_relative_to(place):
        raise FolderError(f"{target}: holds the survey, {advice}")
    if not place.is_relative_to(folder):
        return
    within = f"{place.relative_to(folder).as_posix()}/"
    for job in survey.images:
        for path in files_of(job):
            name = path.relative_to(survey.folder).as_posix()
            if name.startswith(within):
                raise FolderError(f"{target}: holds {name}, which the sheet names, {advice}")


def _states_limit(survey: Survey) -> bool:
    return any(
        inputs.limit is not None
        for job in survey.images
        for inputs in (job.inputs, *(zone.inputs for zone in job.zones))
    )


def criterion_text(criterion: Criterion) -> CriterionText:
    """Return a criterion as the report prints it."""
    return CriterionText(
        criterion=criterion.id,
        title=criterion.title,
        source=criterion.source,
        classes=tuple((each.label, each.text, each.grade) for each in criterion.classes),
        note=criterion.gaps,
    )


def _filled_by_weather(survey: Survey, file: Path) -> Survey:
    log = read_weather(file, survey.utc_offset_hours)
    moments = {job.file: job.taken or image_moment(job.path) for job in survey.images}
    filled = with_weather(survey, log, moments)
    # What the log fills is no longer assumed.
    outdated = assumption_notes(survey.images)
    kept = [note for note in filled.notes if note not in outdated]
    return replace(filled, notes=(*kept, *assumption_notes(filled.images)))


def _outcomes(
    tasks: Iterator[ImageTask], total: int, options: RunOptions
) -> Iterator[tuple[ImageTask, Outcome]]:
    if options.cluster is not None:
        with cluster_executor(options.cluster) as (executor, workers):
            yield from map_over_executor(process_image, tasks, executor, 4 * workers, _lost)
        return
    jobs = options.jobs
    if jobs is None:
        jobs = default_jobs() if total >= _WORTH_A_POOL else 1
    if jobs <= 1:
        yield from map_in_process(process_image, tasks)
        return
    with single_threads():
        yield from map_over_pool(process_image, tasks, min(jobs, total), _lost)


def _lost(task: ImageTask) -> Outcome:
    return failed_image(
        task.job,
        "its worker process ended before the image was done, twice; run again, with --jobs 1 to "
        "see why",
    )


def _collect(
    outcomes: list[tuple[ImageTask, Outcome]], work: Path, target: Path, options: RunOptions
) -> None:
    """Move what was finished for each image into the results."""
    kept = target / ".kept"
    kept.mkdir()
    for task, outcome in outcomes:
        if outcome.key is None:
            continue
        (work / f"{outcome.key}.zip").rename(kept / f"{outcome.key}.zip")
        if options.planes:
            for name in PLANE_NAMES:
                place = target / name / task.plane_name
                place.parent.mkdir(parents=True, exist_ok=True)
                plane_path(work, outcome.key, name).rename(place)


def _tasks(
    survey: Survey,
    criteria: tuple[Criterion, ...],
    response: tuple[tuple[float, float], ...] | None,
    work: Path,
    older: Path | None,
    options: RunOptions,
) -> Iterator[ImageTask]:
    bare = replace(survey, images=())
    names = _plane_names([job.file for job in survey.images])
    for number, job in enumerate(survey.images, 1):
        yield ImageTask(
            number=number,
            job=job,
            survey=bare,
            criteria=criteria,
            response=response,
            work=work,
            older=older,
            plane_name=names[job.file],
            planes=options.planes,
            pictures=options.pictures,
            debug=options.debug,
        )


def _plane_names(files: Sequence[str]) -> dict[str, str]:
    """Name the planes after their images, below the folder of the planes.

    Two images of one stem keep their endings; a name that is none gets a number.
    """
    stems = [str(PurePosixPath(file).with_suffix("")) for file in files]
    counts = Counter(stem.casefold() for stem in stems)
    names: dict[str, str] = {}
    taken: set[str] = set()
    for number, (file, stem) in enumerate(zip(files, stems, strict=True), 1):
        name = f"{file if counts[stem.casefold()] > 1 else stem}.tif"
        inside = ".." not in PurePosixPath(name).parts and not PurePosixPath(name).is_absolute()
        short = all(len(os.fsencode(part)) <= _LONGEST_NAME for part in name.split("/"))
        if not inside or not short:
            name = f"image {number}.tif"
        while name.casefold() in taken:
            name = f"other {name}"
        names[file] = name
        taken.add(name.casefold())
    return names


def _known_criteria(file: Path | None) -> tuple[str, ...]:
    return tuple(each.id for each in all_criteria(file))


def _known_settings(file: Path | None) -> tuple[str, ...]:
    return tuple(name for each in all_criteria(file) for name in each.settings)


class _KeptPictures(Mapping[str, Pictures]):
    """Pictures of finished images, read when they are asked for."""

    def __init__(self, work: Path, keys: Mapping[str, str]) -> None:
        self._work = work
        self._keys = keys

    def __getitem__(self, file: str) -> Pictures:
        kept = load_kept(self._work, self._keys[file])
        if kept is None:
            raise KeyError(file)
        return pictures_from_files(kept.files)

    def __iter__(self) -> Iterator[str]:
        return iter(self._keys)

    def __len__(self) -> int:
        return len(self._keys)
