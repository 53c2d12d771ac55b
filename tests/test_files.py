"""Files are replaced whole or not at all."""

import errno
import os
import stat
from pathlib import Path

import pytest

from kplate.errors import InputError
from kplate.files import replacing


def test_a_new_file_is_written_and_nothing_else(tmp_path):
    path = tmp_path / "a.txt"
    with replacing(path) as temporary:
        assert temporary.parent == tmp_path
        temporary.write_text("new")
        assert not path.exists()
    assert [p.name for p in tmp_path.iterdir()] == ["a.txt"]
    assert path.read_text() == "new"


@pytest.mark.skipif(os.name == "nt", reason="open files cannot be replaced there")
def test_who_reads_the_old_file_reads_it_to_its_end(tmp_path):
    path = tmp_path / "a.txt"
    path.write_text("old")
    with path.open() as reader:
        with replacing(path) as temporary:
            temporary.write_text("new")
        assert reader.read() == "old"
    assert path.read_text() == "new"


@pytest.mark.parametrize("error", [RuntimeError, KeyboardInterrupt, ValueError])
def test_a_failing_writer_leaves_the_old_file_and_no_other(tmp_path, error):
    path = tmp_path / "a.txt"
    path.write_text("old")

    def fail():
        with replacing(path) as temporary:
            temporary.write_text("half")
            raise error("half way")

    with pytest.raises(error, match="half way"):
        fail()
    assert path.read_text() == "old"
    assert list(tmp_path.iterdir()) == [path]


def test_a_full_disk_is_an_input_error_that_names_the_file(tmp_path):
    path = tmp_path / "a.txt"
    path.write_text("old")
    with pytest.raises(InputError) as caught, replacing(path):
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
    assert str(caught.value) == (
        f"cannot write '{path}': No space left on device; see to the disk, or name "
        "another folder."
    )
    assert path.read_text() == "old"
    assert list(tmp_path.iterdir()) == [path]


def test_a_forbidden_folder_is_an_input_error(tmp_path, monkeypatch):
    def refuse(self, **_):
        raise PermissionError(errno.EACCES, os.strerror(errno.EACCES))

    monkeypatch.setattr(Path, "touch", refuse)
    path = tmp_path / "a.txt"
    with pytest.raises(InputError) as caught, replacing(path):
        pass
    assert str(caught.value) == (
        f"cannot write '{path}': Permission denied; name a folder that you may write "
        "to."
    )


def test_a_missing_folder_is_named(tmp_path):
    path = tmp_path / "none" / "a.txt"
    with pytest.raises(InputError) as caught, replacing(path):
        pass
    assert str(caught.value) == (
        f"cannot write '{path}': there is no folder '{path.parent}'; make it, or name "
        "another."
    )


def test_a_folder_is_no_file(tmp_path):
    with pytest.raises(InputError) as caught, replacing(tmp_path):
        pass
    assert str(caught.value) == (
        f"cannot write '{tmp_path}': it is a folder; name a file in it."
    )


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no pipes here")
def test_a_pipe_is_not_replaced(tmp_path):
    path = tmp_path / "pipe"
    os.mkfifo(path)
    with pytest.raises(InputError, match="it is a device or a pipe; name a file"):
        replacing(path).__enter__()
    assert stat.S_ISFIFO(path.stat().st_mode)


def test_a_write_protected_file_is_kept(tmp_path, monkeypatch):
    path = tmp_path / "a.txt"
    path.write_text("old")
    monkeypatch.setattr(os, "access", lambda *_: False)  # root may write to anything
    with pytest.raises(InputError) as caught, replacing(path):
        pass
    assert str(caught.value) == (
        f"cannot write '{path}': the file is write-protected; lift that, or name "
        "another file."
    )
    assert path.read_text() == "old"


def test_a_name_that_cannot_be_is_an_input_error(tmp_path):
    with pytest.raises(InputError, match="name another file"):
        replacing(tmp_path / "a\0b").__enter__()


@pytest.mark.skipif(os.name == "nt", reason="links need rights there")
def test_a_link_stays_and_its_file_is_replaced(tmp_path):
    real, link = tmp_path / "real.txt", tmp_path / "link.txt"
    real.write_text("old")
    link.symlink_to(real)
    with replacing(link) as temporary:
        temporary.write_text("new")
    assert link.is_symlink()
    assert real.read_text() == "new"


@pytest.mark.skipif(os.name == "nt", reason="no modes there")
def test_the_mode_of_a_replaced_file_is_kept(tmp_path):
    path = tmp_path / "a.txt"
    path.write_text("old")
    path.chmod(0o640)
    with replacing(path) as temporary:
        temporary.write_text("new")
    assert stat.S_IMODE(path.stat().st_mode) == 0o640
