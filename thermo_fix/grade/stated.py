"""What a survey's sheet states, over all its images and zones."""

from thermo_fix.records import SceneInputs, Survey


def every_input(survey: Survey) -> list[SceneInputs]:
    """Return the inputs of all images and of all zones that are not left out."""
    return [
        every
        for job in survey.images
        for every in (job.inputs, *(zone.inputs for zone in job.zones if not zone.ignore))
    ]


def told(survey: Survey, key: str) -> list[float]:
    """Return all values of a key that were stated or measured."""
    found = (each.told(key) for each in every_input(survey))
    return [each.value for each in found if each is not None]
