"""Read the sheet of a survey folder into a :class:`~thermo_fix.records.Survey`.

Pure checking: no image is opened. All mistakes of a sheet are reported at once.
"""

from collections import Counter
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TypeVar

from pydantic import ValidationError

from thermo_fix.defaults import default_for, default_value
from thermo_fix.errors import FolderError, SheetError
from thermo_fix.records import Camera, DetectSettings, ImageJob, Origin, Recorded, Survey, Zone
from thermo_fix.sheet import files, ranges, toml_text
from thermo_fix.sheet.building import design_conditions, survey_conditions
from thermo_fix.sheet.inherit import Stated, completed, merged, stated
from thermo_fix.sheet.lines import KeyPath
from thermo_fix.sheet.problems import Problems, nearest
from thermo_fix.sheet.renamed import renewed
from thermo_fix.sheet.schema import (
    SHEET_NAME,
    SHEET_VERSION,
    TOP_KEYS,
    CameraTable,
    ConditionsTable,
    CriteriaTable,
    DesignTable,
    DetectTable,
    ImageTable,
    RadiationTable,
    RecordedTable,
    SceneKeys,
    SurveyTable,
    Table,
    ZoneTable,
)
from thermo_fix.sheet.zones import MAX_ZONES

KnownCriteria = Sequence[str] | Callable[[Path | None], Sequence[str]]
"""Names of criteria, or a function that gives them, also those of the survey's own file."""

_LISTED = 5
"""Files that a note names before it counts the rest."""

_AnyTable = TypeVar("_AnyTable", bound=Table)


def load_survey(
    folder: Path,
    *,
    found_files: Sequence[str] = (),
    known_criteria: KnownCriteria | None = None,
    known_settings: KnownCriteria | None = None,
) -> Survey:
    """Load and check the survey sheet of a folder; without one, assume documented defaults.

    Parameters
    ----------
    folder
        The survey.
    found_files
        TIFF files in the folder, relative to it, with forward slashes. All of them are taken
        when the sheet names no image; those that it does not name are listed in a note.
    known_criteria
        Names that ``[criteria] use`` may hold; None leaves them unchecked. A function gets the
        path of the survey's own criteria file, or None.
    known_settings
        The same for ``[criteria] settings``.

    Returns
    -------
    Survey
        With ``notes`` on what was assumed. An image named in the sheet whose file is missing is
        kept: it fails when it is read, as one image. Where an emissivity or reflected
        temperature is in a file, or is measured or computed later, its Input has the value NaN.

    Raises
    ------
    FolderError
        No such folder, or no image to take.
    SheetError
        With one line for each mistake.

    """
    folder = Path(folder)
    if not folder.is_dir():
        raise FolderError(f"{folder}: no such folder")
    sheet = folder / SHEET_NAME
    if not sheet.exists() and not sheet.is_symlink():
        _refuse_misnamed_sheet(folder)
        return _without_sheet(folder, found_files)
    text = toml_text.read_text(sheet)
    raw = toml_text.parse(text, SHEET_NAME)
    return _SheetLoader(folder, text, raw, found_files, known_criteria, known_settings).load()


def _names(known: KnownCriteria | None, own_file: Path | None) -> Sequence[str] | None:
    return known(own_file) if callable(known) else known


def _refuse_misnamed_sheet(folder: Path) -> None:
    """A sheet that is silently not read would leave all its inputs to assumption."""
    for entry in sorted(folder.iterdir()):
        if entry.name.lower() in (SHEET_NAME, f"{SHEET_NAME}.txt") and entry.is_file():
            raise SheetError(
                f"{entry.name}: the survey sheet must be named {SHEET_NAME}; rename it"
            )


def _without_sheet(folder: Path, found_files: Sequence[str]) -> Survey:
    _refuse_no_images(folder, found_files)
    inputs = completed(Stated())
    return Survey(
        folder=folder,
        sheet=None,
        title=folder.resolve().name,
        purpose="building",
        images=tuple(
            ImageJob(file=name, path=folder / name, inputs=inputs) for name in sorted(found_files)
        ),
        camera=_camera(CameraTable(), None),
        notes=(
            f"There is no survey sheet ({SHEET_NAME}): all inputs are assumed, among them "
            f"{_assumed_in_words()}.",
            "The purpose was not told: a building survey is assumed.",
            *_camera_notes(CameraTable()),
        ),
    )


def _refuse_no_images(folder: Path, found_files: Sequence[str]) -> None:
    if not found_files:
        raise FolderError(f"{folder}: no TIFF file in the folder; there is nothing to do")


def _assumed_in_words() -> str:
    keys = ("emissivity", "reflected_c", "air_c", "humidity", "distance_m")
    return ", ".join(f"{key} = {default_value(key):g}" for key in keys)


@dataclass
class _SheetLoader:
    """One pass over one sheet: check everything, then build the records."""

    folder: Path
    text: str
    raw: dict[str, object]
    found_files: Sequence[str]
    known_criteria: KnownCriteria | None
    known_settings: KnownCriteria | None

    def __post_init__(self) -> None:
        renewal = renewed(self.raw)
        self.problems = Problems(self.text, self.raw, renewal.old_keys)
        self.raw = renewal.sheet
        self._renamed_notes = renewal.notes
        for path, new in renewal.doubled:
            self.problems.add_about_table(
                path, f'"{path[-1]}" is the old name of "{new}", which is stated too; remove it'
            )
        self._resolved_folder = self.folder.resolve()
        self._planes: set[str] = set()
        """Files that hold an input of other images, not an image of the survey."""
        self._missing_photos: list[str] = []

    def load(self) -> Survey:
        self._check_version()
        for key in self.raw:
            if key not in TOP_KEYS:
                self.problems.unknown_key((key,))
        survey = self._table("survey", SurveyTable)
        camera_table = self._table("camera", CameraTable)
        radiation = self._table("radiation", RadiationTable)
        scene_table = self._table("scene", SceneKeys)
        detect_table = self._table("detect", DetectTable)
        criteria = self._table("criteria", CriteriaTable)
        conditions_table = self._table("conditions", ConditionsTable)
        design_table = self._table("design", DesignTable)

        response = self._needed_file(camera_table, "camera", "response_file")
        criteria_file = self._needed_file(criteria, "criteria", "file")
        weather_file = self._needed_file(survey, "survey", "weather")
        scene = self._stated(scene_table, "scene", ("scene",))
        detect = _detect(DetectSettings(), detect_table)
        images = self._images(scene, detect)
        self.problems.raise_any()
        self._check_criteria(criteria, criteria_file)
        self.problems.raise_any()

        if "image" not in self.raw or not images:
            images = self._every_file(scene, detect)
            self.problems.raise_any()
            unnamed: list[str] = []
        else:
            named = {image.file for image in images} | self._planes
            unnamed = sorted(set(self.found_files) - named)
        conditions = survey_conditions(conditions_table)
        design = design_conditions(design_table)
        return Survey(
            folder=self.folder,
            sheet=self.folder / SHEET_NAME,
            title=survey.title or self._resolved_folder.name,
            purpose=survey.purpose or "building",
            images=tuple(replace(job, conditions=conditions, design=design) for job in images),
            conditions=conditions,
            design=design,
            weather_file=weather_file,
            utc_offset_hours=survey.utc_offset_hours,
            camera=_camera(camera_table, response),
            model=radiation.model,
            criteria=criteria.use,
            criteria_settings=criteria.settings,
            criteria_file=criteria_file,
            date=survey.date,
            surveyor=survey.surveyor,
            temperature_unit=survey.temperature_unit,
            language=survey.language,
            notes=self._notes(survey, camera_table, images, unnamed),
        )

    # ------------------------------------------------------------ single tables

    def _check_version(self) -> None:
        version = self.raw.get("sheet_version", SHEET_VERSION)
        if isinstance(version, bool) or not isinstance(version, int) or version < 1:
            self.problems.add(("sheet_version",), f"write sheet_version = {SHEET_VERSION}")
        elif version > SHEET_VERSION:
            self.problems.add(
                ("sheet_version",),
                f"this program reads version {SHEET_VERSION} of the sheet; use a newer program",
            )
            # Nothing else that a newer sheet says can be judged.
            self.problems.raise_any()

    def _validate(self, model: type[_AnyTable], raw: object, path: KeyPath) -> _AnyTable | None:
        """Return the table, without the keys that are wrong, which are noted.

        None when what remains is no such table.
        """
        try:
            return model.model_validate(raw)
        except ValidationError as error:
            self.problems.add_from(error, path)
            bad = {detail["loc"][0] for detail in error.errors() if detail["loc"]}
        if not isinstance(raw, dict) or not bad:
            return None
        try:
            return model.model_validate({key: raw[key] for key in raw if key not in bad})
        except ValidationError:
            return None

    def _table(self, name: str, model: type[_AnyTable]) -> _AnyTable:
        """Return the table, or an empty one when it is absent or wrong (which is noted)."""
        return self._validate(model, self.raw.get(name, {}), (name,)) or model()

    def _find_file(self, name: str, path: KeyPath) -> Path:
        if files.leads_outside(self._resolved_folder, name):
            self.problems.add(
                path, "a link leads out of the survey folder; copy the file into the folder"
            )
        return self.folder / name

    def _find_plane(self, name: str, path: KeyPath) -> Path:
        self._planes.add(name)
        return self._find_file(name, path)

    def _needed_file(self, table: Table, name: str, key: str) -> Path | None:
        """Path of a file without which the whole survey cannot be run."""
        file: str | None = getattr(table, key)
        if file is None:
            return None
        path = self._find_file(file, (name, key))
        try:
            exists = path.is_file()
        except OSError:
            exists = False
        if not exists:
            self.problems.add((name, key), "no such file in the survey folder; add it")
        return path

    def _check_criteria(self, criteria: CriteriaTable, own_file: Path | None) -> None:
        if criteria.use:
            known = _names(self.known_criteria, own_file)
            for place, name in enumerate(criteria.use):
                self._check_name(name, known, ("criteria", "use", place), "criterion")
        if criteria.settings:
            known = _names(self.known_settings, own_file)
            for name in criteria.settings:
                self._check_name(name, known, ("criteria", "settings", name), "setting")

    def _check_name(self, name: str, known: Sequence[str] | None, path: KeyPath, what: str) -> None:
        if known is None or name in known:
            return
        hint = f'; nearest: "{nearest(name, tuple(known))}"' if known else ""
        self.problems.add(path, f"unknown {what}{hint}")

    def _stated(self, table: SceneKeys, scope: str, path: KeyPath) -> Stated:
        return stated(table, scope, path, self._find_plane)

    # ------------------------------------------------------------ images and zones

    def _images(self, scene: Stated, detect: DetectSettings) -> tuple[ImageJob, ...]:
        entries = self.raw.get("image", [])
        if not isinstance(entries, list) or not all(isinstance(one, dict) for one in entries):
            self.problems.add(
                ("image",), "write [[image]] with double brackets, once for each image"
            )
            return ()
        self._check_duplicate_files(entries)
        jobs = []
        for place, entry in enumerate(entries):
            job = self._image(entry, ("image", place), scene, detect)
            if job is not None:
                jobs.append(job)
        return tuple(jobs)

    def _check_duplicate_files(self, entries: Sequence[Mapping[str, object]]) -> None:
        first: dict[str, tuple[str, int]] = {}
        for place, entry in enumerate(entries):
            name = entry.get("file")
            if not isinstance(name, str) or files.name_problem(name) is not None:
                continue
            name = files.normal_name(name)
            earlier = first.setdefault(name.casefold(), (name, place))
            if earlier[1] == place:
                continue
            words = (
                "this file has an entry already; put all its zones under one [[image]]"
                if earlier[0] == name
                else f'this is "{earlier[0]}" in other letters, and on many systems the same '
                "file; rename or leave out one of them"
            )
            self.problems.add(("image", place, "file"), words, see=("image", earlier[1], "file"))

    def _image(
        self, entry: Mapping[str, object], path: KeyPath, scene: Stated, detect: DetectSettings
    ) -> ImageJob | None:
        own = {key: value for key, value in entry.items() if key != "zone"}
        table = self._validate(ImageTable, own, path)
        zone_tables, names = self._zone_tables(entry.get("zone", []), (*path, "zone"))
        if table is None:
            return None
        image_path = self._find_file(table.file, (*path, "file"))
        in_force = merged(scene, self._stated(table, f"image {table.file}", path))
        self._check_foil(in_force, names, path, table.file)
        built = []
        foils = {in_force.reflected_zone}
        for place, zone in zone_tables:
            zone_path = (*path, "zone", place)
            here = merged(
                in_force, self._stated(zone, f"zone {zone.name} of {table.file}", zone_path)
            )
            if here.reflected_stated_at[:4] == zone_path:
                self._check_foil(here, names, zone_path, table.file)
            foils.add(here.reflected_zone)
            built.append((place, zone, here))
        for place, zone, _ in built:
            if zone.name in foils and zone.role == "tape":
                self.problems.add(
                    (*path, "zone", place, "role"),
                    'a reflected temperature is measured on this zone; write role = "foil"',
                )
        return ImageJob(
            file=table.file,
            path=image_path,
            inputs=completed(in_force),
            zones=tuple(
                Zone(
                    name=zone.name,
                    polygon=zone.polygon,
                    inputs=completed(here),
                    like=zone.like,
                    load_a=None if zone.load_a is None else zone.load_a.value,
                    load_u_a=None if zone.load_a is None else zone.load_a.u,
                    rated_a=zone.rated_a,
                    ignore=zone.ignore,
                    role="foil" if zone.name in foils else zone.role,
                )
                for _, zone, here in built
            ),
            detect=_detect(detect, table.detect),
            asset=table.asset,
            photo=self._photo(table.photo, path),
            taken=table.taken,
            note=table.note,
        )

    def _zone_tables(
        self, entries: object, path: KeyPath
    ) -> tuple[list[tuple[int, ZoneTable]], set[str]]:
        """Return the sound zones with their places, and the names of all."""
        if not isinstance(entries, list) or not all(isinstance(one, dict) for one in entries):
            self.problems.add(path, "write [[image.zone]] with double brackets, once for each zone")
            return [], set()
        if len(entries) > MAX_ZONES:
            self.problems.add(path, f"{len(entries)} zones are too many (at most {MAX_ZONES})")
            return [], set()
        tables = []
        first: dict[str, int] = {}
        for place, entry in enumerate(entries):
            name = entry.get("name")
            if isinstance(name, str) and first.setdefault(name.strip(), place) != place:
                self.problems.add(
                    (*path, place, "name"),
                    "another zone of this image has that name; rename one of them",
                    see=(*path, first[name.strip()], "name"),
                )
            table = self._validate(ZoneTable, entry, (*path, place))
            if table is not None:
                tables.append((place, table))
        return tables, set(first)

    def _check_foil(self, in_force: Stated, names: set[str], path: KeyPath, file: str) -> None:
        """The foil zone must be one of the same image."""
        zone = in_force.reflected_zone
        if zone is None or zone in names:
            return
        at = in_force.reflected_stated_at
        if at[: len(path)] == path:
            hint = f'; nearest: "{nearest(zone, tuple(names))}"' if names else ""
            self.problems.add((*at, "zone"), f'"{file}" has no zone of that name{hint}')
        else:
            self.problems.add_about_table(
                path,
                f'the reflected temperature comes from a zone "{zone}" (as [scene] says), and '
                f'"{file}" has no zone of that name; add the zone, or state reflected_c here',
            )

    def _photo(self, name: str | None, path: KeyPath) -> Path | None:
        if name is None:
            return None
        photo = self._find_file(name, (*path, "photo"))
        try:
            if photo.is_file():
                return photo
        except OSError:
            pass
        self._missing_photos.append(name)
        return None

    def _every_file(self, scene: Stated, detect: DetectSettings) -> tuple[ImageJob, ...]:
        if scene.reflected_zone is not None:
            self.problems.add(
                (*scene.reflected_stated_at, "zone"),
                "a zone belongs to an image, and this sheet names no image; add [[image]] and "
                "[[image.zone]] tables",
            )
        taken = sorted(set(self.found_files) - self._planes)
        _refuse_no_images(self.folder, taken)
        inputs = completed(scene)
        return tuple(
            ImageJob(file=name, path=self.folder / name, inputs=inputs, detect=detect)
            for name in taken
        )

    # ------------------------------------------------------------ notes

    def _notes(
        self,
        survey: SurveyTable,
        camera: CameraTable,
        images: Sequence[ImageJob],
        unnamed: Sequence[str],
    ) -> tuple[str, ...]:
        notes = list(self._renamed_notes)
        if survey.purpose is None:
            notes.append("The purpose was not told: a building survey is assumed.")
        if not self.raw.get("image"):
            notes.append(
                f"The sheet names no image: all {len(images)} TIFF files in the folder are taken."
            )
        if unnamed:
            one = len(unnamed) == 1
            notes.append(
                f"{len(unnamed)} TIFF file{'' if one else 's'} in the folder "
                f"{'is' if one else 'are'} not named in the sheet and not run: {_listed(unnamed)}."
            )
        if self._missing_photos:
            notes.append(
                "Photographs named in the sheet that are not in the folder: "
                f"{_listed(self._missing_photos)}."
            )
        notes.extend(assumption_notes(images))
        notes.extend(_camera_notes(camera))
        seen = {
            (one.key, one.value)
            for image in images
            for inputs in (image.inputs, *(zone.inputs for zone in image.zones))
            for one in inputs.values.values()
            if one.origin == "given"
        }
        odd = (ranges.plausibility_note(key, value) for key, value in sorted(seen, key=str))
        notes.extend(note for note in odd if note is not None)
        if survey.purpose == "electrical":
            notes.extend(_electrical_notes(images))
        return tuple(notes)


def _listed(names: Sequence[str]) -> str:
    shown = ", ".join(names[:_LISTED])
    rest = len(names) - _LISTED
    return shown if rest <= 0 else f"{shown} and {rest} more"


def assumption_notes(images: Sequence[ImageJob]) -> list[str]:
    """Return one sentence for each key that was not told, with the images it concerns."""
    counts: Counter[str] = Counter()
    values: dict[str, set[float]] = {}
    for image in images:
        for key, one in image.inputs.values.items():
            if one.origin == "assumed":
                counts[key] += 1
                values.setdefault(key, set()).add(one.value)
    notes = []
    for key, count in counts.items():
        several = values[key]
        value = (
            f"{min(several):g}" if len(several) == 1 else f"{min(several):g} to {max(several):g}"
        )
        unit = default_for(key).unit
        of = "" if count == len(images) else f" for {count} of {len(images)} images"
        notes.append(
            f"{key} was not told{of}: {value}{'' if unit == '1' else f' {unit}'} is assumed."
        )
    return notes


def _electrical_notes(images: Sequence[ImageJob]) -> list[str]:
    """Point out loads above the rating, and a wind that is told but not used."""
    notes = [
        f'Zone "{zone.name}" of {image.file} carries {zone.load_a:g} A, more than its rated '
        f"{zone.rated_a:g} A."
        for image in images
        for zone in image.zones
        if zone.load_a is not None and zone.rated_a is not None and zone.load_a > zone.rated_a
    ]
    windy = [
        image.file
        for image in images
        if "wind_m_s" in image.inputs.values and image.inputs.outdoors is None
    ]
    if windy:
        notes.append(
            f"wind_m_s is told and not used: write outdoors = true where the parts stand in the "
            f"open ({_listed(windy)})."
        )
    return notes


def _detect(outer: DetectSettings, table: DetectTable) -> DetectSettings:
    return replace(outer, **table.model_dump(exclude_none=True))


def _camera(table: CameraTable, response: Path | None) -> Camera:
    accuracy_given = table.accuracy_k is not None or table.accuracy_fraction is not None
    linear = table.pixel == "linear"
    return Camera(
        pixel=table.pixel,
        scale=table.scale if linear else None,
        offset=(table.offset or 0.0) if linear else None,
        band_um=table.band_um,
        response_file=response,
        ifov_mrad=table.ifov_mrad,
        noise_k=_or_default(table.noise_k, "camera.noise_k"),
        noise_origin=_origin(table.noise_k is not None),
        accuracy_k=_or_default(table.accuracy_k, "camera.accuracy_k"),
        accuracy_fraction=_or_default(table.accuracy_fraction, "camera.accuracy_fraction"),
        accuracy_origin=_origin(accuracy_given),
        nonuniformity_k=_or_default(table.nonuniformity_k, "camera.nonuniformity_k"),
        nonuniformity_origin=_origin(table.nonuniformity_k is not None),
        recorded=_recorded(table.recorded),
    )


def _recorded(table: RecordedTable | None) -> Recorded:
    said = table or RecordedTable()
    return Recorded(
        emissivity=_or_default(said.emissivity, "camera.recorded.emissivity"),
        reflected_c=_or_default(said.reflected_c, "camera.recorded.reflected_c"),
        air_c=_or_default(said.air_c, "camera.recorded.air_c"),
        transmittance=_or_default(said.transmittance, "camera.recorded.transmittance"),
        origin=_origin(bool(said.model_fields_set)),
    )


def _or_default(value: float | None, key: str) -> float:
    return default_value(key) if value is None else value


def _origin(given: bool) -> Origin:
    return "given" if given else "assumed"


def _camera_notes(table: CameraTable) -> list[str]:
    notes = []
    if table.recorded is None or not table.recorded.model_fields_set:
        notes.append(
            "The settings that the camera had applied were not told: emissivity "
            f"{default_value('camera.recorded.emissivity'):g} and transmittance "
            f"{default_value('camera.recorded.transmittance'):g} are assumed, so that the "
            "readings are taken as apparent temperatures."
        )
    elif len(table.recorded.model_fields_set) < len(RecordedTable.model_fields):
        rest = [
            key for key in RecordedTable.model_fields if key not in table.recorded.model_fields_set
        ]
        notes.append(
            "Of the settings that the camera had applied, these were not told and are assumed: "
            + ", ".join(f"{key} = {default_value(f'camera.recorded.{key}'):g}" for key in rest)
            + "."
        )
    if table.accuracy_k is None and table.accuracy_fraction is None:
        notes.append(
            "The camera's accuracy was not told: the larger of "
            f"{default_value('camera.accuracy_k'):g} K and "
            f"{default_value('camera.accuracy_fraction'):g} of the reading in degC is assumed."
        )
    else:
        notes.extend(
            f"{key} was not told: {default_value(f'camera.{key}'):g} is assumed; the larger of "
            "the two accuracies holds."
            for key in ("accuracy_k", "accuracy_fraction")
            if getattr(table, key) is None
        )
    if table.pixel in ("celsius", "kelvin") and (
        table.scale is not None or table.offset is not None
    ):
        notes.append(
            f'scale and offset are not used: they go with pixel = "linear", and the sheet says '
            f'pixel = "{table.pixel}".'
        )
    return notes
