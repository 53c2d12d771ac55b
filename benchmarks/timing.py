"""Times of each stage to 1,000,000 unknowns: ``python -m benchmarks timing``.

Each size runs in a process of its own, so that its peak of memory is its own. Times are
CPU seconds of one thread, the best of a few runs; on a shared machine even these are
noisy, so quote ratios of one run. The yardstick is one bare CHOLMOD factorisation
(ordering and numbers) of the same matrix.
"""

import json
import math
import resource
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterator, Sequence
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np
from threadpoolctl import threadpool_limits

import kplate as kp
from benchmarks import cases, records
from kplate import assembly
from kplate.boundary import constrain
from kplate.dofs import Numbering
from kplate.elements import ELEMENTS
from kplate.linalg import Factor
from kplate.loads import Case
from kplate.meshing import mesh_outline, size_for
from kplate.solve.static import solve_static

SIZES = (10_000, 30_000, 100_000, 300_000, 1_000_000)
QUICK = (10_000, 30_000, 100_000)
AIMS = {"ratio": 1.7, "exponent": 1.15, "memory at 1,000,000": 2.5}
ROOT = Path(__file__).parents[1]
# Unknowns a triangle of a large mesh: half a vertex and one and a half edges.
SHARES = {
    name: 0.5 * own.per_vertex + 1.5 * own.per_edge for name, own in ELEMENTS.items()
}


@dataclass(frozen=True, kw_only=True)
class Timing:
    """What one size takes.

    Parameters
    ----------
    element : str
        Which.
    unknowns, triangles : int
        Of the mesh.
    stages : dict of str to float
        CPU seconds: meshing, stiffness, assembly, ordering, factor, back substitution,
        the rest of the solution, recovery, writing.
    bare : float
        One bare factorisation, ordering included.
    solve : float
        The whole solution without meshing, recovery and writing.
    memory, memory_all : float
        Peak in GB after the solution, and after recovery and writing.
    """

    element: str
    unknowns: int
    triangles: int
    stages: dict[str, float]
    bare: float
    solve: float
    memory: float
    memory_all: float

    @property
    def ratio(self) -> float:
        """Whole solution over the bare factorisation."""
        return self.solve / self.bare


def main(sizes: Sequence[int] = SIZES, element: str = "dkt") -> list[Timing]:
    """Measure, print, and return what was measured."""
    found = []
    print(f"square plate, {element}; CPU seconds of one thread; load {_load()}")
    for size in sizes:
        found.append(measured_apart(size, element))
        if len(found) == 1:
            print(_row("unknowns", *found[0].stages, "bare", "solve", "ratio", "GB"))
        print(lines_of(found[-1]), flush=True)
    print("\n".join(summary(found)))
    return found


def commands() -> Iterator[str]:
    """Lines about the time of a whole command, and of importing the package."""
    panel = ROOT / "meshes" / "pit-cover.toml"
    with tempfile.TemporaryDirectory() as out:
        whole = _command("-m", "kplate", "check", str(panel), "--out", out)
    start = _command("-c", "import gmsh, numpy, scipy.sparse")
    light = _command("-c", "import kplate")
    base = _command("-c", "import numpy, scipy.sparse")
    yield f"kplate check meshes/pit-cover.toml: {whole:.2f} s of CPU"
    yield f"python -c 'import gmsh, numpy, scipy.sparse': {start:.2f} s"
    yield f"import kplate / import numpy, scipy.sparse: {light / base:.2f}"


def _command(*arguments: str) -> float:
    """CPU seconds of a Python process, the best of three."""
    times = []
    for _ in range(3):
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        words = [sys.executable, *arguments]
        subprocess.run(words, check=True, capture_output=True, cwd=ROOT)
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        user = after.ru_utime - before.ru_utime
        times.append(user + after.ru_stime - before.ru_stime)
    return min(times)


def lines_of(own: Timing) -> str:
    """One line of the table."""
    times = (f"{seconds:.3g}" for seconds in own.stages.values())
    ends = (f"{own.bare:.3g}", f"{own.solve:.3g}", f"{own.ratio:.2f}")
    memory = f"{own.memory:.2f}/{own.memory_all:.2f}"
    return _row(f"{own.unknowns:,}", *times, *ends, memory)


def summary(found: Sequence[Timing]) -> Iterator[str]:
    """Growth, and the aims."""
    yield (
        "GB: peak after the solution / after recovery and writing. solve: all but "
        "meshing, recovery\nand writing. ratio: solve over bare."
    )
    worst = max(own.ratio for own in found)
    yield f"largest ratio {worst:.2f} (aim {AIMS['ratio']})"
    if len(found) > 1:
        yield (
            f"growth exponent of solve {exponent(found):.2f} "
            f"(aim {AIMS['exponent']}), of the bare factorisation "
            f"{_slope(found, [own.bare for own in found]):.2f}"
        )
    last = found[-1]
    if last.unknowns > 900_000:
        aim = AIMS["memory at 1,000,000"]
        yield f"peak at {last.unknowns:,}: {last.memory:.2f} GB (aim {aim})"


def exponent(found: Sequence[Timing]) -> float:
    """Power of the unknowns with which the solution's time grows."""
    return _slope(found, [own.solve for own in found])


def measured_apart(size: int, element: str) -> Timing:
    """Measure one size in a process of its own."""
    words = [sys.executable, "-m", "benchmarks.timing", str(size), element]
    out = subprocess.run(words, check=True, capture_output=True, text=True, cwd=ROOT)
    return Timing(**json.loads(out.stdout.splitlines()[-1]))


def measure(size: int, element: str = "dkt") -> Timing:
    """Measure one size in this process."""
    plate = cases.plate(records.record("ssss_u_1"))
    case = Case(name="uniform", loads=[kp.Pressure(-1.0)])
    stages: dict[str, float] = {}
    wanted = size_for(plate.outline, max(int(size / SHARES[element]), 8))
    stages["meshing"], mesh = _once(lambda: mesh_outline(plate.outline, size=wanted))
    runs = 3 if size <= 100_000 else 1
    whole, state = _best(
        lambda: solve_static(plate, mesh, [case], element=element), runs
    )
    memory = _peak()
    solution = kp.Solution(state=state)
    recovery, _ = _once(lambda: (solution.samples, solution.peak("von Mises")))
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "fields.vtu"
        writing, _ = _once(lambda: kp.write_vtk(solution, path))
    memory_all = _peak()
    own = ELEMENTS[element]
    numbering = Numbering(mesh=mesh, per_vertex=own.per_vertex, per_edge=own.per_edge)
    constraints = constrain(plate, numbering)
    stages["stiffness"], _ = _best(
        lambda: [None for _ in assembly.element_stiffness(plate, numbering, own)], runs
    )
    made, lower = _best(lambda: assembly.stiffness(plate, own, constraints), runs)
    stages["assembly"] = max(made - stages["stiffness"], 0.0)
    stages["ordering"], stages["factor"] = _factored(lower, runs)
    factor = Factor(lower)
    right = np.ones(lower.shape[0])
    stages["back substitution"], _ = _best(lambda: factor.solve(right), runs)
    # The solution goes back twice: once more with the residual.
    known = made + stages["ordering"] + stages["factor"]
    known += 2.0 * stages["back substitution"]
    stages["rest of the solution"] = max(whole - known, 0.0)
    stages["recovery"], stages["writing"] = recovery, writing
    return Timing(
        element=element,
        unknowns=numbering.count,
        triangles=len(mesh.triangles),
        stages=stages,
        bare=stages["ordering"] + stages["factor"],
        solve=whole,
        memory=memory,
        memory_all=memory_all,
    )


def _factored(lower: Any, runs: int) -> tuple[float, float]:
    """CPU seconds of ordering and of the numbers of a bare factorisation."""
    from cvxopt import cholmod, matrix, spmatrix

    columns = np.repeat(np.arange(lower.shape[1]), np.diff(lower.indptr))
    A = spmatrix(
        matrix(lower.data),
        matrix(lower.indices.astype(np.int64)),
        matrix(columns.astype(np.int64)),
        lower.shape,
    )
    with threadpool_limits(limits=1):
        ordering, factor = _best(lambda: cholmod.symbolic(A, uplo="L"), runs)
        numbers, _ = _best(lambda: cholmod.numeric(A, factor), runs)
    return ordering, numbers


def _best(run: Callable[[], Any], runs: int) -> tuple[float, Any]:
    """Least CPU seconds of some runs, and what the last of them gave."""
    least, result = math.inf, None
    for _ in range(runs):
        result = None  # two of them at a time would double the memory
        seconds, result = _once(run)
        least = min(least, seconds)
    return least, result


def _once(run: Callable[[], Any]) -> tuple[float, Any]:
    start = time.process_time()
    result = run()
    return time.process_time() - start, result


def _peak() -> float:
    """Peak of this process's memory in GB, not that of the one that started it."""
    status = Path("/proc/self/status")
    if status.exists():
        lines = status.read_text("ascii", "ignore").splitlines()
        peak = next(line.split()[1] for line in lines if line.startswith("VmHWM"))
        return int(peak) * 1024 / 1e9
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024 / 1e9


def _slope(found: Sequence[Timing], seconds: Sequence[float]) -> float:
    x = [math.log(own.unknowns) for own in found]
    return float(np.polyfit(x, [math.log(s) for s in seconds], 1)[0])


def _row(*cells: str) -> str:
    return "".join(f"{_short(cell):>11s}" for cell in cells)


def _short(cell: str) -> str:
    return {"back substitution": "back", "rest of the solution": "rest"}.get(cell, cell)


def _load() -> str:
    """How busy the machine is, in processes waiting for its processors."""
    import os

    return f"{os.getloadavg()[0]:.1f} on {os.cpu_count()} processors"


if __name__ == "__main__":
    print(json.dumps(asdict(measure(int(sys.argv[1]), sys.argv[2]))))
