"""Meshing in a process of its own, with a limit of time.

Plain outlines are proven clean before Gmsh sees them. Where zones, seams and marks are
fragmented, or a drawing is read, nobody can prove that Gmsh comes back; it then works
in a second process, which is killed by its number when its time is up.
"""

import os
import pickle
import subprocess
import sys
from collections.abc import Sequence

from kplate.errors import InputError, KplateError, MeshError
from kplate.mesh import Mesh
from kplate.meshing import Place, mesh_outline
from kplate.outline import Outline

# Gmsh makes a million triangles in about 40 s; what takes longer than this is stuck.
SECONDS = 300.0
_ERRORS = {"InputError": InputError, "MeshError": MeshError}


def mesh_guarded(
    outline: Outline,
    *,
    size: float,
    fine: Sequence[tuple[Place, float]] = (),
    graded: Sequence[tuple[Place, float]] = (),
    seconds: float = SECONDS,
) -> Mesh:
    """Mesh an outline in a second process.

    Parameters
    ----------
    outline, size, fine, graded
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
    job = pickle.dumps((outline, size, tuple(fine), tuple(graded)))
    command = [sys.executable, "-c", "from kplate.guard import work; work()"]
    pipe = subprocess.PIPE
    own = {**os.environ, "PYTHONPATH": os.pathsep.join(filter(None, sys.path))}
    with subprocess.Popen(
        command, stdin=pipe, stdout=pipe, stderr=pipe, env=own
    ) as worker:
        try:
            answer, complaint = worker.communicate(job, timeout=seconds)
        except subprocess.TimeoutExpired as error:
            raise MeshError(
                f"Gmsh did not come back within {seconds:g} s at size {size:g} m; draw "
                "what nearly touches apart, or ask for fewer triangles."
            ) from error
        finally:
            worker.kill()
    try:
        kind, content = pickle.loads(answer)
    except (pickle.UnpicklingError, EOFError) as error:
        last = complaint.decode(errors="replace").strip().rpartition("\n")[2]
        raise MeshError(
            f"the second process ended without a mesh at size {size:g} m (status "
            f"{worker.returncode}{': ' * bool(last)}{last}); please report the outline."
        ) from error
    if kind != "mesh":
        raise _ERRORS.get(kind, MeshError)(content)
    mesh: Mesh = content
    return mesh


def work() -> None:
    """Do the second process's part: a job from stdin, the answer to stdout."""
    outline, size, fine, graded = pickle.load(sys.stdin.buffer)
    answer: tuple[str, object]
    try:
        answer = ("mesh", mesh_outline(outline, size=size, fine=fine, graded=graded))
    except KplateError as error:
        answer = (type(error).__name__, str(error))
    sys.stdout.buffer.write(pickle.dumps(answer))
