"""Gmsh in a process of its own, with a limit of time.

Plain outlines are proven clean before Gmsh sees them. Where zones, seams and marks are
fragmented, or a STEP file is read, nobody can prove that Gmsh comes back; it then works
in a second process, which is killed by its number when its time is up.
"""

import os
import pickle
import subprocess
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

from kplate.drawings import Drawing
from kplate.errors import InputError, KplateError, MeshError
from kplate.mesh import Mesh
from kplate.meshing import Place, mesh_outline
from kplate.outline import Outline
from kplate.polygon import Chords
from kplate.step import read_step

# Gmsh makes a million triangles in about 40 s; what takes longer than this is stuck.
SECONDS = 300.0
_ERRORS = {"InputError": InputError, "MeshError": MeshError}
_JOBS: dict[str, Callable[..., Any]] = {"mesh": mesh_outline, "step": read_step}


def mesh_guarded(
    outline: Outline,
    *,
    size: float,
    fine: Sequence[tuple[Place, float]] = (),
    graded: Sequence[tuple[Place, float]] = (),
    around: int | None = None,
    seconds: float = SECONDS,
) -> Mesh:
    """Mesh an outline in a second process.

    Parameters
    ----------
    outline, size, fine, graded, around
        As in `kplate.meshing.mesh_outline`.
    seconds : float
        How long it may take.

    Returns
    -------
    Mesh

    Raises
    ------
    InputError, MeshError
        As in `mesh_outline`; MeshError too where the time is up or the process dies.
    """
    options = {
        "size": size,
        "fine": tuple(fine),
        "graded": tuple(graded),
        "around": around,
    }
    what = f"meshing at size {size:g} m"
    mesh: Mesh = _guarded("mesh", (outline, options), seconds, what)
    return mesh


def read_step_guarded(
    path: Path,
    *,
    unit: str | None = None,
    snap: float | None = None,
    chords: Chords = "ask",
    seconds: float = SECONDS,
) -> Drawing:
    """Read a STEP file in a second process.

    Parameters
    ----------
    path, unit, snap, chords
        As in `kplate.step.read_step`.
    seconds : float
        How long it may take.

    Returns
    -------
    Drawing

    Raises
    ------
    InputError, MeshError
        As in `read_step`; MeshError too where the time is up or the process dies.
    """
    options = {"unit": unit, "snap": snap, "chords": chords}
    drawing: Drawing = _guarded("step", (path, options), seconds, f"reading {path}")
    return drawing


def _guarded(job: str, given: tuple[Any, Any], seconds: float, what: str) -> Any:
    """Have a job done by a second process."""
    command = [sys.executable, "-c", "from kplate.guard import work; work()"]
    pipe = subprocess.PIPE
    own = {**os.environ, "PYTHONPATH": os.pathsep.join(filter(None, sys.path))}
    with subprocess.Popen(
        command, stdin=pipe, stdout=pipe, stderr=pipe, env=own
    ) as worker:
        try:
            answer, said = worker.communicate(pickle.dumps((job, given)), seconds)
        except subprocess.TimeoutExpired as error:
            raise MeshError(
                f"Gmsh did not come back within {seconds:g} s, {what}; draw what "
                "nearly touches apart, or ask for fewer triangles."
            ) from error
        finally:
            worker.kill()
    try:
        kind, content = pickle.loads(answer)
    except (pickle.UnpicklingError, EOFError) as error:
        last = said.decode(errors="replace").strip().rpartition("\n")[2]
        raise MeshError(
            f"the second process ended without an answer, {what} (status "
            f"{worker.returncode}{': ' * bool(last)}{last}); please report the outline."
        ) from error
    if kind != "done":
        raise _ERRORS.get(kind, MeshError)(content)
    return content


def work() -> None:
    """Do the second process's part: a job from stdin, the answer to stdout."""
    # What Gmsh's own libraries print must not get between the bytes of the answer.
    out = os.fdopen(os.dup(1), "wb")
    os.dup2(2, 1)
    job, (subject, options) = pickle.load(sys.stdin.buffer)
    try:
        answer: tuple[str, object] = ("done", _JOBS[job](subject, **options))
    except KplateError as error:
        answer = (type(error).__name__, str(error))
    with out:
        out.write(pickle.dumps(answer))
