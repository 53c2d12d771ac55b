"""Twenty thicknesses against one: how much the law of the thickness saves."""

import time
from itertools import pairwise
from pathlib import Path

import kplate as kp

MESHES = Path(__file__).parents[1] / "meshes"
PANELS = ("pit-cover", "tank-wall", "landing-cover")


def main() -> None:
    """Print CPU seconds of one thickness, and twenty as ratios of it.

    Each case has a self-weight too, which does not scale as the rest does.
    """
    print("sizes by one solve; 1.00 is the same panel judged at the thinnest alone")
    print("panel           one thickness  twenty  with load factors")
    for name in PANELS:
        one, many, whole = _seconds(kp.read_panel(MESHES / f"{name}.toml"))
        print(f"{name:14s}{one:13.2f} s  {many / one:6.2f}  {whole / one:17.2f}")


def _seconds(panel: kp.Panel) -> tuple[float, float, float]:
    """CPU seconds of one thickness, of twenty, and of these with load factors."""
    cases = [
        kp.Case(name=own.name, loads=[*own.loads, kp.SelfWeight()])
        for own in panel.cases
    ]
    twenty = tuple(panel.plate.thickness * (1.0 + 0.05 * k) for k in range(20))

    def judged(stock: tuple[float, ...]) -> kp.Sizing:
        thicknesses = kp.Stock(thicknesses=stock)
        return kp.size(panel.plate, cases, panel.limits, thicknesses)

    judged(twenty[:1])  # loads the libraries
    marks = [time.process_time()]
    judged(twenty[:1])
    marks.append(time.process_time())
    found = judged(twenty)
    marks.append(time.process_time())
    factors = [own.load_factor for own in found.sizes]
    marks.append(time.process_time())
    assert min(factors) >= 0.0
    one, many, rest = (b - a for a, b in pairwise(marks))
    return one, many, many + rest


if __name__ == "__main__":
    main()
