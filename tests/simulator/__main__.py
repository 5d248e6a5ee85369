"""Write a simulated survey for people: `python -m tests.simulator KIND SEED FOLDER`."""

import argparse
from pathlib import Path

from tests.simulator.scenes import KINDS
from tests.simulator.spectral import RESPONSES
from tests.simulator.survey import write_survey


def main() -> None:
    parser = argparse.ArgumentParser(prog="python -m tests.simulator", description=__doc__)
    parser.add_argument("kind", choices=sorted(KINDS))
    parser.add_argument("seed", type=int)
    parser.add_argument("folder", type=Path)
    parser.add_argument("--images", type=int, default=4)
    parser.add_argument("--perturb", action="store_true", help="draw the sheet around the truth")
    parser.add_argument("--response", choices=sorted(RESPONSES), default="box")
    given = parser.parse_args()
    truths = write_survey(
        given.folder, given.kind, given.seed, given.images, given.perturb, given.response
    )
    planted = sum(len(truth["planted"]) for truth in truths)
    print(f"{given.folder}: {len(truths)} images, {planted} planted anomalies")


if __name__ == "__main__":
    main()
