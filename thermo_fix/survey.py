"""The run: read -> correct -> find -> measure -> grade -> report, and nothing else."""

import hashlib
import pickle
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from thermo_fix import cautions
from thermo_fix.constants import ZERO_CELSIUS_K
from thermo_fix.correct import correct_frame, radiation_models
from thermo_fix.criteria import DEFAULT_USE, Criterion, built_in, load_criteria, parse_criteria
from thermo_fix.errors import FolderError, SheetError, ThermoFixError
from thermo_fix.find import find_regions
from thermo_fix.grade import conditions, grade_finding
from thermo_fix.measure import assess_image, measure_image, measure_regions
from thermo_fix.read import list_images, read_frame, reading_k
from thermo_fix.read.response import read_response
from thermo_fix.records import (
    Camera,
    CorrectedFrame,
    ImageJob,
    ImageResult,
    Planes,
    Survey,
    SurveyResult,
)
from thermo_fix.report import (
    CriterionText,
    Pictures,
    encode_photo,
    encode_pictures,
    write_report,
)
from thermo_fix.results import Staging, findings_document, write_document, write_plane, write_table
from thermo_fix.sheet import check_polygon, label_zones, load_survey, overlap_notes

RESULTS_NAME = "results"
"""Name of the results folder inside the survey folder, where no other is given."""

_WHAT = {"building": "building", "electrical": "electrical installation"}

Progress = Callable[[int, int, str], None]
"""Called with the number of images done, the number of all, and the file just done."""


@dataclass(frozen=True, slots=True)
class ImageTask:
    """Everything that is needed to do one image, and nothing that cannot be pickled."""

    number: int
    """From 1, in the order of the sheet; prefix of the findings' ids."""
    job: ImageJob
    survey: Survey
    """Without its images."""
    criteria: tuple[Criterion, ...]
    response: tuple[tuple[float, float], ...] | None
    plane_name: str
    """Path of the written planes below ``corrected/`` and ``uncertainty/``."""
    folder: Path
    """Where the planes and pictures go."""


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
    survey = load_survey(folder, found_files=found, known_criteria=_known_criteria)
    if survey.criteria:
        return survey
    names = DEFAULT_USE[survey.purpose]
    note = f"The sheet names no criteria; those for a survey of a {_WHAT[survey.purpose]} are used."
    return replace(survey, criteria=names, notes=(*survey.notes, note))


def run_survey(
    folder: Path | str, out: Path | str | None = None, *, progress: Progress | None = None
) -> SurveyResult:
    """Do the whole job for a folder of radiometric images.

    Parameters
    ----------
    folder
        The survey folder, with or without a sheet.
    out
        Results folder; ``results`` inside the survey folder by default. Written as a whole and
        only when complete.
    progress
        Called after each image.

    Returns
    -------
    SurveyResult
        ``failed`` names the images that could not be used.

    Raises
    ------
    FolderError, SheetError
        The survey cannot be run; nothing was written.

    """
    folder = Path(folder)
    target = folder / RESULTS_NAME if out is None else Path(out)
    survey = open_survey(folder)
    criteria = load_criteria(survey.criteria, survey.criteria_file)
    response_file = survey.camera.response_file
    response = None if response_file is None else read_response(response_file)
    radiation_models(survey.model, survey.camera, response)
    run_time = datetime.now(UTC).isoformat(timespec="seconds")
    sheet = None if survey.sheet is None else survey.sheet.read_bytes()
    with Staging(target) as staging:
        store = _PictureStore(staging.folder)
        images = []
        tasks = list(_tasks(survey, criteria, response, staging.folder))
        for done, task in enumerate(tasks, 1):
            images.append(process_image(task, store))
            if progress is not None:
                progress(done, len(tasks), task.job.file)
        result = SurveyResult(
            survey=survey,
            images=tuple(images),
            conditions=conditions(survey),
            cautions=cautions.general(survey.purpose),
        )
        document = findings_document(
            result,
            run_time=run_time,
            sheet_sha256=None if sheet is None else hashlib.sha256(sheet).hexdigest(),
        )
        write_document(staging.folder / "findings.json", document)
        write_table(staging.folder / "findings.csv", result)
        write_report(
            result,
            store,
            staging.folder / "report.html",
            sheet_text=None if sheet is None else sheet.decode("utf-8-sig"),
            run_time=run_time,
            criteria=[criterion_text(each) for each in criteria],
        )
        store.remove()
        staging.finish()
    return result


def process_image(task: ImageTask, store: "_PictureStore") -> ImageResult:
    """Do one image: everything between its file and its result.

    Parameters
    ----------
    task
        The image, its inputs and the criteria.
    store
        Where its pictures go.

    Returns
    -------
    ImageResult
        With status ``failed`` and one line where the image cannot be used.

    """
    job, camera = task.job, task.survey.camera
    try:
        corrected, notes = _corrected(task)
    except ThermoFixError as error:
        return ImageResult(
            file=job.file,
            status="failed",
            error=str(error),
            asset=job.asset,
            note=job.note,
            zones=job.zones,
        )
    found = find_regions(corrected)
    if found.spikes:
        notes = (*notes, f"{found.spikes} isolated pixels were bridged when looking for findings.")
    if found.unlike:
        notes = (
            *notes,
            f"{found.unlike} regions were left out: their zone's like zones show the same.",
        )
    purpose = task.survey.purpose
    measured = measure_regions(corrected, found.regions, camera, str(task.number), purpose)
    settings = task.survey.criteria_settings
    result = replace(
        measure_image(corrected, notes),
        findings=tuple(grade_finding(each, task.criteria, settings) for each in measured),
        assessments=assess_image(corrected, measured, purpose),
        photo=job.photo,
    )
    planes = Planes(
        recorded_c=corrected.reading_k - np.float32(ZERO_CELSIUS_K),
        corrected_c=corrected.surface_k - np.float32(ZERO_CELSIUS_K),
        uncertainty_k=corrected.uncertainty_k,
    )
    for name, plane in (
        ("corrected", planes.corrected_c),
        ("uncertainty", planes.uncertainty_k),
    ):
        path = task.folder / name / task.plane_name
        path.parent.mkdir(parents=True, exist_ok=True)
        write_plane(path, plane, carried_tags=corrected.frame.carried_tags)
    pictures = encode_pictures(planes, result)
    if job.photo is not None:
        photo = encode_photo(job.photo)
        if photo is None:
            note = f"{job.photo.name}: the photograph cannot be read and is left out."
            result = replace(result, notes=(*result.notes, note))
        else:
            pictures = replace(pictures, photo_jpeg=photo)
    store.keep(job.file, pictures)
    return result


def criterion_text(criterion: Criterion) -> CriterionText:
    """Return a criterion as the report prints it."""
    return CriterionText(
        criterion=criterion.id,
        title=criterion.title,
        source=criterion.source,
        classes=tuple((each.label, each.text, each.grade) for each in criterion.classes),
        note=criterion.gaps,
    )


def _corrected(task: ImageTask) -> tuple[CorrectedFrame, tuple[str, ...]]:
    job, camera = task.job, task.survey.camera
    frame = read_frame(job.path, camera)
    rows, columns = frame.shape
    notes = list(frame.notes)
    if frame.encoding.note:
        notes.append(frame.encoding.note)
    for zone in job.zones:
        message = check_polygon(zone, columns, rows)
        if message is not None:
            notes.append(f"{job.file}: {message}")
    notes += overlap_notes(job.zones, frame.shape)
    corrected = correct_frame(
        frame,
        reading_k(frame),
        job,
        label_zones(job.zones, frame.shape),
        camera,
        radiation_models(task.survey.model, camera, task.response),
        _planes(job),
    )
    return corrected, tuple(notes)


def _planes(job: ImageJob) -> dict[Path, NDArray[np.float32]]:
    """Read the emissivity and reflected-temperature planes that an image needs."""
    planes = {}
    # As numbers, whatever they mean: 'celsius' leaves values as they are.
    plain = Camera(pixel="celsius")
    for inputs in (job.inputs, *(zone.inputs for zone in job.zones)):
        for path in (inputs.emissivity_file, inputs.reflected_file):
            if path is not None and path not in planes:
                planes[path] = read_frame(path, plain).values.astype(np.float32)
    return planes


def _tasks(
    survey: Survey,
    criteria: tuple[Criterion, ...],
    response: tuple[tuple[float, float], ...] | None,
    folder: Path,
) -> Iterator[ImageTask]:
    bare = replace(survey, images=())
    names = _plane_names([job.file for job in survey.images])
    for number, job in enumerate(survey.images, 1):
        yield ImageTask(number, job, bare, criteria, response, names[job.file], folder)


def _plane_names(files: list[str]) -> dict[str, str]:
    """Name the planes after their images; two images of one stem keep their endings."""
    stems = [str(Path(file).with_suffix("")) for file in files]
    folded = [stem.casefold() for stem in stems]
    return {
        file: f"{file if folded.count(name) > 1 else stem}.tif"
        for file, stem, name in zip(files, stems, folded, strict=True)
    }


def _known_criteria(file: Path | None) -> tuple[str, ...]:
    names = list(built_in())
    if file is not None:
        try:
            names += [each.id for each in parse_criteria(file.read_text("utf-8"), file.name)]
        except (OSError, UnicodeDecodeError) as error:
            raise SheetError(
                f"{file.name}: the criteria file cannot be read ({type(error).__name__}); "
                "give a UTF-8 TOML file in the survey folder"
            ) from error
    return tuple(names)


class _PictureStore(Mapping[str, Pictures]):
    """Pictures on disk, so that memory does not grow with the number of images."""

    def __init__(self, folder: Path) -> None:
        self._folder = folder / ".pictures"
        self._folder.mkdir()

    def keep(self, file: str, pictures: Pictures) -> None:
        self._path(file).write_bytes(pickle.dumps(pictures))

    def remove(self) -> None:
        for path in self._folder.iterdir():
            path.unlink()
        self._folder.rmdir()

    def __getitem__(self, file: str) -> Pictures:
        path = self._path(file)
        if not path.exists():
            raise KeyError(file)
        pictures = pickle.loads(path.read_bytes())
        assert isinstance(pictures, Pictures)  # written by keep
        return pictures

    def __iter__(self) -> Iterator[str]:
        return iter(())

    def __len__(self) -> int:
        return sum(1 for _ in self._folder.iterdir())

    def _path(self, file: str) -> Path:
        return self._folder / hashlib.sha256(file.encode()).hexdigest()
