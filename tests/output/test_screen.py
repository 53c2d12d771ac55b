"""Drawing without a display or a GL library: other ways, or one clear line."""

import os
import subprocess
import sys

import pytest

from kplate.cli import main
from kplate.errors import InputError
from kplate.output import screen
from kplate.output.record import solution_record, write_json
from kplate.output.view import write_view
from kplate.output.vtk import write_vtk


@pytest.fixture(scope="module")
def files(cover, tmp_path_factory):
    """A .vtu file with its record beside it."""
    path = tmp_path_factory.mktemp("results") / "cover.vtu"
    write_vtk(cover, path)
    record = solution_record(cover, "0.1.0")
    record["panel"] = {"name": "landing cover"}
    write_json(record, path.with_suffix(".json"))
    return path


@pytest.fixture
def no_display(monkeypatch):
    """Off screen, whatever the machine has."""
    monkeypatch.delenv("DISPLAY", raising=False)
    # `check_drawing` chooses again, and what it chose is put back afterwards.
    monkeypatch.setenv("VTK_DEFAULT_OPENGL_WINDOW", "")
    monkeypatch.delenv("VTK_DEFAULT_OPENGL_WINDOW")


@pytest.mark.parametrize(
    ("outcome", "why"),
    [
        ((-11, ""), "OpenGL is missing or broken"),
        (
            (
                1,
                "ImportError: libGL.so.1: cannot open shared object file: No such file",
            ),
            "libGL.so.1 is missing",
        ),
    ],
)
def test_missing_libraries_are_named_before_anything_is_drawn(
    files, no_display, monkeypatch, outcome, why
):
    monkeypatch.setattr(screen, "_run", lambda *_: outcome)
    screen._find_way.cache_clear()
    with pytest.raises(InputError) as caught:
        write_view(files, files.with_name("a.png"))
    assert str(caught.value) == (
        f"nothing can be drawn in 3-D: {why}; install the system packages libgl1 "
        "libegl1 libxrender1 (their names on Debian and Ubuntu), or look at the "
        "picture that kplate check wrote."
    )


@pytest.mark.skipif(sys.platform != "linux", reason="only there without a display")
def test_the_second_way_to_draw_is_taken_where_the_first_does_not_work(
    no_display, monkeypatch
):
    tried = []

    def run(_, environment):
        tried.append(environment["VTK_DEFAULT_OPENGL_WINDOW"])
        return (0, "") if tried[-1] == "vtkOSOpenGLRenderWindow" else (-11, "")

    monkeypatch.setattr(screen, "_run", run)
    screen._find_way.cache_clear()
    screen.check_drawing(off_screen=True)
    assert tried == ["vtkEGLRenderWindow", "vtkOSOpenGLRenderWindow"]
    assert os.environ["VTK_DEFAULT_OPENGL_WINDOW"] == "vtkOSOpenGLRenderWindow"
    screen._find_way.cache_clear()


def test_a_process_that_hangs_counts_as_one_that_fails(monkeypatch):
    def hang(*_, **__):
        raise subprocess.TimeoutExpired("python", 1.0)

    monkeypatch.setattr(subprocess, "run", hang)
    assert screen._run("", {}) == (-1, "")


def run(*arguments, **changes):
    """The command line in a process of its own, with a changed environment."""
    environment = {k: v for k, v in os.environ.items() if k != "DISPLAY"}
    return subprocess.run(
        [sys.executable, "-m", "kplate", "view", *map(str, arguments)],
        capture_output=True,
        text=True,
        env=environment | changes,
        timeout=300,
        check=False,
    )


@pytest.mark.slow
@pytest.mark.skipif(sys.platform != "linux", reason="DISPLAY is of X11")
def test_the_command_without_a_display_says_one_line(files):
    done = run(files)
    assert done.returncode == 2
    assert done.stdout == ""
    assert done.stderr == (
        f"kplate: {files}: no window can be opened: there is no display (DISPLAY is "
        "not set); kplate check writes a picture (.png), which needs none.\n"
    )


@pytest.mark.slow
@pytest.mark.skipif(sys.platform != "linux", reason="libraries are hidden as of Linux")
def test_the_command_without_opengl_says_one_line(files, tmp_path):
    """Libraries of no bytes stand before the true ones."""
    hidden = tmp_path / "hidden"
    hidden.mkdir()
    for name in (
        "libGL.so.1", "libEGL.so.1", "libOSMesa.so.8", "libOSMesa.so.6",
        "libOSMesa.so", "libGL.so", "libEGL.so", "libGLX.so.0", "libOpenGL.so.0",
    ):  # fmt: skip
        (hidden / name).write_bytes(b"")
    picture = tmp_path / "a.png"
    done = run(files, "--picture", picture, LD_LIBRARY_PATH=str(hidden))
    assert done.returncode == 2
    assert done.stdout == ""
    assert done.stderr.startswith(f"kplate: {files}: nothing can be drawn in 3-D: ")
    assert done.stderr.count("\n") == 1
    assert not picture.exists()


@pytest.mark.slow
def test_the_command_draws_a_picture_without_a_display(files, tmp_path):
    picture = tmp_path / "a.png"
    done = run(files, "--picture", picture, "--quantity", "von Mises", "--case", "jack")
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout == f"written: {picture}\n"
    assert picture.read_bytes().startswith(b"\x89PNG")


def test_options_of_a_picture_without_one_are_refused(files, capsys):
    assert main(["view", str(files), "--case", "jack"]) == 2
    assert capsys.readouterr().err == (
        f"kplate: {files}: --quantity and --case are of a picture; add --picture FILE, "
        "or choose them in the window.\n"
    )
