"""The ``solve`` commands: options, and how an answer is printed. No physics."""

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from thermo_fix.errors import DomainError
from thermo_fix.terminal import say

if TYPE_CHECKING:
    from thermo_fix.solve import Bench, Solved

# The solving itself is imported inside the commands, so that --help answers at once.

solve = typer.Typer(
    name="solve",
    help=(
        "Find an input from a reference in the images: reflected temperature from crumpled foil, "
        "emissivity from a patch of tape or paint or a contact reading, transmittance from a view "
        "with and one without the window."
    ),
    no_args_is_help=True,
    rich_markup_mode=None,
)

_LISTED_PARTS = 4
_PART_SHARE = 0.1
"""Contributions below this share of the largest are not printed."""

Folder = Annotated[Path, typer.Argument(help="The survey folder, with survey.toml.")]
MaybeFolder = Annotated[
    Path | None,
    typer.Argument(help="The survey folder, with survey.toml; leave it out to give numbers."),
]
Image = Annotated[str | None, typer.Option(help="Image, as the sheet names it.")]
Write = Annotated[bool, typer.Option("--write", help="Put the value into the survey sheet.")]
Force = Annotated[bool, typer.Option("--force", help="With --write: replace a value there.")]
Model = Annotated[str, typer.Option(help="Numbers only: radiation model, total or band.")]
Band = Annotated[tuple[float, float], typer.Option(help="Numbers only: band of the camera, um.")]
SameU = Annotated[
    float,
    typer.Option(
        "--same-u",
        help="Standard uncertainty, K, of the target's temperature being the same both times.",
    ),
]


@solve.command()
def reflected(
    folder: Folder,
    image: Image = None,
    zone: Annotated[
        str | None, typer.Option(help='Foil zone; the one of role "foil" if not given.')
    ] = None,
    write: Write = False,
    force: Force = False,
) -> None:
    """Reflected apparent temperature from a zone of crumpled foil (ASTM E1862)."""
    from thermo_fix.solve import solve_reflected

    _show(solve_reflected(folder, image, zone), folder, write, force)


@solve.command()
def emissivity(
    folder: MaybeFolder = None,
    image: Image = None,
    zone: Annotated[
        str | None, typer.Option(help="Target; what lies outside all zones if not given.")
    ] = None,
    reference: Annotated[
        str | None,
        typer.Option(help='Zone of known emissivity; the one of role "tape" if not given.'),
    ] = None,
    contact_c: Annotated[
        float | None, typer.Option(help="Contact reading of the target, degC, instead of a zone.")
    ] = None,
    contact_u: Annotated[float, typer.Option(help="Its standard uncertainty, K.")] = 1.0,
    same_u: SameU = 0.5,
    write: Write = False,
    force: Force = False,
    reading_c: Annotated[
        float | None, typer.Option(help="Numbers only: apparent temperature of the target, degC.")
    ] = None,
    reflected_c: Annotated[
        float | None, typer.Option(help="Numbers only: reflected apparent temperature, degC.")
    ] = None,
    reflected_u: Annotated[
        float, typer.Option(help="Numbers only: its standard uncertainty, K.")
    ] = 2.0,
    reference_reading_c: Annotated[
        float | None, typer.Option(help="Numbers only: apparent temperature of the patch, degC.")
    ] = None,
    reference_emissivity: Annotated[
        float, typer.Option(help="Numbers only: emissivity of the patch.")
    ] = 0.95,
    reference_u: Annotated[
        float, typer.Option(help="Numbers only: its standard uncertainty.")
    ] = 0.02,
    model: Model = "total",
    band_um: Band = (8.0, 14.0),
) -> None:
    """Emissivity from a patch of known emissivity, or from a contact reading (ASTM E1933).

    thermo-fix solve emissivity FOLDER --image IR_0205.tif --zone "bare bar" --reference "tape"
    """
    from thermo_fix.solve import emissivity_from_numbers, solve_emissivity

    if folder is not None:
        _refuse_numbers(reading_c, reflected_c, reference_reading_c)
        solved = solve_emissivity(
            folder,
            image,
            zone,
            reference=reference,
            contact_c=contact_c,
            contact_u=contact_u,
            same_u=same_u,
        )
        _show(solved, folder, write, force)
        return
    if reading_c is None or reflected_c is None:
        raise DomainError("give a survey folder, or --reading-c and --reflected-c")
    solved = emissivity_from_numbers(
        _bench(model, band_um, (reflected_c, reflected_u)),
        reading_c,
        contact_c=contact_c,
        contact_u=contact_u,
        reference_reading_c=reference_reading_c,
        reference_emissivity=(reference_emissivity, reference_u),
        same_u=same_u,
    )
    _show(solved, None, write, force)


@solve.command()
def transmittance(
    folder: MaybeFolder = None,
    through: Annotated[
        str | None, typer.Option(help="View through the window, IMAGE:ZONE.")
    ] = None,
    direct: Annotated[str | None, typer.Option(help="View without it, IMAGE:ZONE.")] = None,
    window_c: Annotated[
        float | None,
        typer.Option(help="Temperature of the window, degC; else as the sheet says, or the air's."),
    ] = None,
    window_u: Annotated[float | None, typer.Option(help="Its standard uncertainty, K.")] = None,
    same_u: SameU = 0.5,
    write: Write = False,
    force: Force = False,
    through_c: Annotated[
        float | None, typer.Option(help="Numbers only: apparent temperature through it, degC.")
    ] = None,
    direct_c: Annotated[
        float | None, typer.Option(help="Numbers only: apparent temperature without it, degC.")
    ] = None,
    reflectance: Annotated[
        float, typer.Option(help="Numbers only: of a window that mirrors its own temperature.")
    ] = 0.0,
    model: Model = "total",
    band_um: Band = (8.0, 14.0),
) -> None:
    """Transmittance of a window from two views of one steady target (ASTM E1897)."""
    from thermo_fix.solve import solve_transmittance, transmittance_from_numbers

    if folder is not None:
        _refuse_numbers(through_c, direct_c)
        if through is None or direct is None:
            raise DomainError("give both --through IMAGE:ZONE and --direct IMAGE:ZONE")
        solved = solve_transmittance(
            folder,
            _image_and_zone("--through", through),
            _image_and_zone("--direct", direct),
            window_c=window_c,
            window_u=window_u,
            same_u=same_u,
        )
        _show(solved, folder, write, force)
        return
    if through_c is None or direct_c is None or window_c is None:
        raise DomainError("give a survey folder, or --through-c, --direct-c and --window-c")
    solved = transmittance_from_numbers(
        _bench(model, band_um, (20.0, 0.0)),
        through_c,
        direct_c,
        (window_c, 1.0 if window_u is None else window_u),
        reflectance=(reflectance, 0.0),
        same_u=same_u,
    )
    _show(solved, None, write, force)


def _bench(model: str, band_um: tuple[float, float], reflected: tuple[float, float]) -> "Bench":
    from thermo_fix.solve import Bench

    if model not in ("total", "band"):
        raise DomainError(f'--model {model}: write "total" or "band"')
    return Bench(model="band" if model == "band" else "total", band_um=band_um, reflected=reflected)


def _refuse_numbers(*numbers: float | None) -> None:
    if any(number is not None for number in numbers):
        raise DomainError("readings as numbers go without a survey folder; leave out one of them")


def _image_and_zone(option: str, text: str) -> tuple[str, str]:
    image, colon, zone = text.partition(":")
    if not (image and colon and zone):
        raise DomainError(f'{option} {text}: write IMAGE:ZONE, such as "IR_0001.tif:lug A"')
    return image, zone


def _show(solved: "Solved", folder: Path | None, write: bool, force: bool) -> None:
    from thermo_fix.solve import write_to_sheet

    if write and folder is None:
        raise DomainError("--write needs a survey folder")
    if force and not write:
        raise DomainError("--force goes with --write")
    written = None
    if write and folder is not None:
        written = write_to_sheet(folder, solved, force=force)
    unit = f" {solved.unit}" if solved.unit else ""
    digits = solved.digits
    low, high = solved.interval
    say(f"{solved.name} of {solved.of}: {solved.value:.{digits}f}{unit}")
    say(f"  standard uncertainty {solved.u:.{digits}f} (k = 1)")
    say(f"  95 % interval {low:.{digits}f} to {high:.{digits}f}{unit}")
    for line in solved.inputs:
        say(f"  from {line}")
    say(f"  procedure: {solved.procedure}")
    largest = max(solved.parts.values(), default=0.0)
    for name, part in list(solved.parts.items())[:_LISTED_PARTS]:
        if part > 0.0 and part >= _PART_SHARE * largest:
            say(f"  contribution {part:.{digits + 1}f} from {name}")
    for caution in solved.cautions:
        say(f"  caution: {caution}")
    if written is not None:
        say(f"written to {written}:")
    elif solved.place is not None:
        where = f"[[image]] {solved.place.file}"
        if solved.place.zone is not None:
            where += f", zone {solved.place.zone}"
        say(f"for the sheet, at {where}:")
    else:
        say("for the sheet:")
    say(f"  {solved.sheet_line}")
