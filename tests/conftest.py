"""Settings shared by all tests."""

import ezdxf
import hypothesis
import pytest

hypothesis.settings.register_profile(
    "kplate", derandomize=True, deadline=None, max_examples=50
)
hypothesis.settings.load_profile("kplate")


@pytest.fixture
def drawn(tmp_path):
    """Make a DXF file by a function that draws in the model space; return its path."""

    def make(draw, *, unit=4, version="R2010"):
        document = ezdxf.new(version, units=unit)
        draw(document.modelspace())
        path = tmp_path / "drawing.dxf"
        document.saveas(path)
        return path

    return make
