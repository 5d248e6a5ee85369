"""The work for one image: a pure function of small arguments that can be sent anywhere.

It reads one file and leaves its finished work in a folder; what comes back is small. The same
function serves one process, a pool of processes and a cluster.
"""

import contextlib
import hashlib
import json
import os
import shutil
import stat
import traceback
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from thermo_fix import cautions
from thermo_fix.correct import correct_frame, planes_of, radiation_models
from thermo_fix.criteria import Criterion
from thermo_fix.errors import (
    ImageError,
    SurveyError,
    ThermoFixError,
    UnreadableImage,
    about_file,
    one_line,
    reason_of,
)
from thermo_fix.find import find_regions
from thermo_fix.grade import grade_finding
from thermo_fix.measure import assess_image, measure_image, measure_regions
from thermo_fix.read import DEFAULT_LIMITS, read_frame, reading_k
from thermo_fix.read.photo import read_photo
from thermo_fix.records import (
    Camera,
    CorrectedFrame,
    ImageJob,
    ImageResult,
    Planes,
    Survey,
)
from thermo_fix.report import encode_photo, encode_pictures
from thermo_fix.report.archive import pictures_from_files, pictures_to_files
from thermo_fix.results import write_plane
from thermo_fix.results.kept import KeptImage, canonical, keep_image, key_of, load_kept
from thermo_fix.sheet import check_polygon, label_zones, overlap_notes
from thermo_fix.sheet.files import leads_outside
from thermo_fix.version import __version__

PLANE_NAMES = ("corrected", "uncertainty")
_PLANES_INDEX = "planes.json"


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
    work: Path
    """Folder for finished images."""
    older: Path | None
    """Folder of an earlier result, to take over what has not changed."""
    plane_name: str
    """Name of the planes in the results."""
    planes: bool = True
    """Whether corrected and uncertainty planes are wanted."""
    pictures: bool = True
    """Whether pictures are wanted."""
    debug: bool = False
    """Whether to show where in the program an image failed, and to stop at a fault of it."""


@dataclass(frozen=True, slots=True)
class Outcome:
    """What comes back of an image."""

    result: ImageResult
    key: str | None
    """Of its finished work; None for a failed image."""
    taken_over: bool = False
    """Whether nothing had to be computed."""


def process_image(task: ImageTask) -> Outcome:
    """Do one image: everything between its file and its result.

    Parameters
    ----------
    task
        The image, its inputs and the criteria.

    Returns
    -------
    Outcome
        With status ``failed`` and one line where the image cannot be used.

    """
    job = task.job
    try:
        check_place(job, task.survey)
        hashes = {path: _file_hash(path) for path in files_of(job)}
        key = _key(task, hashes)
        found = _taken_over(task, key)
        if found is not None:
            return Outcome(replace(found.result, photo=job.photo, zones=job.zones), key, True)
        kept = _compute(task, key)
        _refuse_changed(job, hashes, kept.result.sha256)
    except SurveyError:
        raise  # as where the disk is full: no image would fare better
    except Exception as error:
        if task.debug:
            traceback.print_exception(error)
        if task.debug and not isinstance(error, ThermoFixError | OSError | MemoryError):
            raise
        return failed_image(job, _reason(error))
    keep_image(task.work, key, kept)
    return Outcome(kept.result, key)


def failed_image(job: ImageJob, reason: str) -> Outcome:
    """Return what is said of an image that cannot be used."""
    return Outcome(
        ImageResult(
            file=job.file,
            status="failed",
            error=about_file(job.file, one_line(reason)),
            asset=job.asset,
            note=job.note,
            zones=job.zones,
        ),
        None,
    )


def _reason(error: Exception) -> str:
    if isinstance(error, ThermoFixError):
        return str(error)
    if isinstance(error, OSError):
        return f"cannot be read ({reason_of(error)}); check its permissions and its disk"
    if isinstance(error, MemoryError):
        return "too large for the memory of this computer; run with --jobs 1"
    return (
        f"a fault of this program ({type(error).__name__}: {error}); please report it with what "
        "thermo-fix --debug run shows"
    )


def check_place(job: ImageJob, survey: Survey) -> None:
    """Raise UnreadableImage where a link leads from the image's name out of the survey folder."""
    if leads_outside(survey.folder.resolve(), job.file):
        raise UnreadableImage(
            "a link leads out of the survey folder; copy the file into the folder"
        )


def _refuse_changed(job: ImageJob, hashes: Mapping[Path, str], decoded: str | None) -> None:
    """Refuse work on files that are no longer those that its key speaks of."""
    changed = [path for path in files_of(job) if path != job.path]
    changed = [path for path in changed if _file_hash(path) != hashes[path]]
    if decoded != hashes[job.path]:
        changed.insert(0, job.path)
    if changed:
        about = "" if changed[0] == job.path else f"{changed[0].name} "
        raise UnreadableImage(
            f"{about}changed while it was read; wait until nothing writes to it, and run again"
        )


def plane_path(work: Path, key: str, name: str) -> Path:
    """Return where a finished image's plane lies in the work folder."""
    return work / f"{key}.{name}.tif"


def _compute(task: ImageTask, key: str) -> KeptImage:
    job, camera, purpose = task.job, task.survey.camera, task.survey.purpose
    corrected, notes = correct_image(job, task.survey, task.response)
    found = find_regions(corrected)
    if found.unlike:
        notes = (
            *notes,
            f"{found.unlike} regions were left out: their zone's like zones show the same.",
        )
    measured = measure_regions(corrected, found.regions, camera, str(task.number), purpose)
    settings = task.survey.criteria_settings
    summed = measure_image(corrected, notes, camera)
    if found.spikes:
        summed = replace(
            summed, cautions=(*summed.cautions, cautions.defective_pixels(found.spikes))
        )
    result = replace(
        summed,
        findings=tuple(grade_finding(each, task.criteria, settings) for each in measured),
        assessments=assess_image(corrected, measured, purpose),
        photo=job.photo,
    )
    planes = planes_of(corrected)
    files: dict[str, bytes] = {}
    if task.planes:
        files[_PLANES_INDEX] = _write_planes(task, key, corrected, planes)
    if task.pictures:
        pictures = encode_pictures(planes, result)
        if job.photo is not None:
            photo, note = _photo(job.photo)
            pictures = replace(pictures, photo_jpeg=photo)
            if note is not None:
                result = replace(result, notes=(*result.notes, note))
        files |= pictures_to_files(pictures)
    return KeptImage(result, files)


def _photo(path: Path) -> tuple[bytes | None, str | None]:
    """Return a photograph for the report, or a note on why there is none."""
    name = one_line(path.name)
    try:
        photo = encode_photo(read_photo(path))
    except ImageError as error:
        return None, f"{name}: the photograph is left out: {error}."
    note = f"{name}: the photograph cannot be read and is left out."
    return photo, note if photo is None else None


def _write_planes(task: ImageTask, key: str, corrected: CorrectedFrame, planes: Planes) -> bytes:
    hashes = {}
    for name, plane in zip(PLANE_NAMES, (planes.corrected_c, planes.uncertainty_k), strict=True):
        path = plane_path(task.work, key, name)
        write_plane(path, plane, carried_tags=corrected.frame.carried_tags)
        hashes[name] = _file_hash(path)
    return json.dumps(hashes, sort_keys=True).encode()


def _taken_over(task: ImageTask, key: str) -> KeptImage | None:
    """Return finished work of this key, from an interrupted run or an earlier result."""
    kept = _whole(task.work, key, task)
    if kept is not None and _planes_are_whole(
        kept, {name: plane_path(task.work, key, name) for name in PLANE_NAMES}, task
    ):
        return kept
    if task.older is None:
        return None
    kept = _whole(task.older / ".kept", key, task)
    if kept is None:
        return None
    old = {name: task.older / name / task.plane_name for name in PLANE_NAMES}
    if not _planes_are_whole(kept, old, task):
        return None
    if task.planes:
        for name in PLANE_NAMES:
            _link(old[name], plane_path(task.work, key, name))
    _link(task.older / ".kept" / f"{key}.zip", task.work / f"{key}.zip")
    return kept


def _whole(folder: Path, key: str, task: ImageTask) -> KeptImage | None:
    """Return kept work, every byte of it read and compared with its checksum, or None.

    A picture that is damaged would be missed only in the report.
    """
    kept = load_kept(folder, key)
    if kept is None or not task.pictures:
        return kept
    try:
        pictures_from_files(kept.files)
    except (KeyError, TypeError, ValueError):
        return None
    return kept


def _planes_are_whole(kept: KeptImage, paths: dict[str, Path], task: ImageTask) -> bool:
    if not task.planes:
        return True
    try:
        hashes = json.loads(kept.files[_PLANES_INDEX])
        return all(_file_hash(paths[name]) == hashes[name] for name in PLANE_NAMES)
    except (OSError, KeyError, ValueError):
        return False


def _link(source: Path, target: Path) -> None:
    """Make a file appear at another place, without copying where the file system can."""
    with contextlib.suppress(FileNotFoundError):
        target.unlink()
    try:
        os.link(source, target)
    except OSError:
        partial = target.with_name(f"{target.name}.{os.getpid()}.partial")
        shutil.copyfile(source, partial)
        partial.replace(target)


def _key(task: ImageTask, hashes: Mapping[Path, str]) -> str:
    """Return the key of an image: its content, its inputs, the software."""
    folder = task.survey.folder
    parts = [
        __version__.encode(),
        canonical(task.number),
        canonical(task.job, folder),
        canonical(replace(task.survey, folder=folder, sheet=None, notes=()), folder),
        canonical(task.criteria),
        canonical(task.response),
        canonical([task.planes, task.pictures]),
    ]
    parts += [hashes[path].encode() for path in files_of(task.job)]
    return key_of(parts)


def files_of(job: ImageJob) -> list[Path]:
    """Return the files that the result of an image depends on, its own first."""
    files = [job.path]
    if job.photo is not None:
        files.append(job.photo)
    for inputs in (job.inputs, *(zone.inputs for zone in job.zones)):
        files += [
            path for path in (inputs.emissivity_file, inputs.reflected_file) if path is not None
        ]
    return files


def _file_hash(path: Path) -> str:
    """Return the SHA-256 of a file; ``absent`` where it is no regular file, or one too large.

    What is wrong with such a file is said by whoever reads it.
    """
    try:
        facts = path.stat()
    except (FileNotFoundError, NotADirectoryError):
        return "absent"
    if not stat.S_ISREG(facts.st_mode) or facts.st_size > DEFAULT_LIMITS.max_file_bytes:
        return "absent"
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


def correct_image(
    job: ImageJob, survey: Survey, response: tuple[tuple[float, float], ...] | None
) -> tuple[CorrectedFrame, tuple[str, ...]]:
    """Read and correct one image of a survey, and return notes on how it was read.

    Parameters
    ----------
    job
        The image.
    survey
        For its camera and radiation model.
    response
        Points of the camera's response curve (um, relative), where the sheet names a file.

    Raises
    ------
    ImageError
        The image cannot be used.

    """
    camera = survey.camera
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
        radiation_models(survey.model, camera, response),
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
