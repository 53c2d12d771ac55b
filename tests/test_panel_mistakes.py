"""Mistakes in panel files are named; nothing but a panel or a complaint comes."""

import re
import warnings
from functools import partial
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from mistakes_judged import JUDGED, ROAMING
from mistakes_stated import LOAD_1, STATED
from panel_texts import BASE, RICH, SAMPLES, read_text, with_limit

from kplate.cli import main
from kplate.errors import InputError, KplateWarning
from kplate.panel import Panel, read_panel

MISTAKES = [*STATED, *JUDGED]


@pytest.fixture
def read(tmp_path):
    return partial(read_text, tmp_path)


# One of each section goes through the command line.
COMMANDED = [
    next(i for i, (_, message) in enumerate(MISTAKES) if message.startswith(start))
    for start in (
        "[panel] thickness",
        "[outline] points",
        "[[hole]]",
        "[[zone]]",
        "[[seam]]",
        "[[mark]]",
        "[supports]",
        LOAD_1,
        ROAMING,
        "[[combination]]",
        "[limits] stock",
        "[limits] deflection, item",
        "[[ask]]",
        "section [outline]",
    )
]


@pytest.mark.parametrize(("text", "message"), MISTAKES, ids=range(len(MISTAKES)))
def test_a_mistake_is_named(read, text, message):
    with pytest.raises(InputError) as caught:
        read(text)
    assert str(caught.value) == message


def test_no_mistake_is_listed_twice():
    assert len({text for text, _ in MISTAKES}) == len(MISTAKES)
    assert BASE not in dict(MISTAKES)


@pytest.mark.parametrize("command", ["check", "size"])
@pytest.mark.parametrize("number", COMMANDED)
def test_a_command_says_it_in_one_line_and_loses_nothing(
    tmp_path, capsys, monkeypatch, command, number
):
    text, message = MISTAKES[number]
    monkeypatch.chdir(tmp_path)
    path, older = tmp_path / "bad.toml", tmp_path / "results" / "bad" / "bad.vtu"
    path.write_text(text, encoding="utf-8")
    older.parent.mkdir(parents=True)
    older.write_text("of last week", encoding="utf-8")
    assert main([command, "bad.toml"]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert said.err == f"kplate: bad.toml: {message}\n"
    assert path.read_text("utf-8") == text
    assert older.read_text("utf-8") == "of last week"
    found = {own for own in tmp_path.rglob("*") if own.is_file()}
    assert found == {path, older}


def test_a_stock_that_leaves_nothing_is_said_by_size(tmp_path, capsys):
    path = tmp_path / "bad.toml"
    lost = 'stock = ["3 mm"]\nunder_tolerance = "2 mm"\ncorrosion = "1 mm"'
    path.write_text(with_limit(lost), encoding="utf-8")
    assert main(["size", str(path)]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert said.err == (
        f"kplate: {path}: under_tolerance and corrosion, 3 mm, leave nothing of the "
        "stock thickness 3 mm; take it off the list.\n"
    )


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (
            b"[panel]\nname = lid\n",
            "is not valid TOML: Invalid value (at line 2, column 8).",
        ),
        (
            b'[panel]\nheld in plane = "no"\n',
            "is not valid TOML: Expected '=' after a key in a key/value pair (at "
            "line 2, "
            'column 6); a name with spaces stands in quotes, "held in plane" = "no".',
        ),
        (
            b'[panel]\nname = "\xe9"\n',
            "is not UTF-8 text (byte 0xe9 in line 2); save it as UTF-8.",
        ),
        (b"a = " + b"[" * 9999, "nests its values too deeply."),
    ],
)
def test_a_file_that_is_no_toml(tmp_path, content, message):
    path = tmp_path / "panel.toml"
    path.write_bytes(content)
    with pytest.raises(InputError) as caught:
        read_panel(path)
    assert str(caught.value) == f"'{path}' {message}"


def test_a_file_that_cannot_be_read(tmp_path):
    with pytest.raises(InputError) as caught:
        read_panel(tmp_path)
    assert str(caught.value) == f"'{tmp_path}' is a folder; name a panel file (TOML)."
    path = tmp_path / "absent.toml"
    with pytest.raises(InputError) as caught:
        read_panel(path)
    assert (
        str(caught.value)
        == f"cannot read panel file '{path}': No such file or directory."
    )
    with pytest.raises(InputError, match=r"^cannot read panel file 'a.x00b': "):
        read_panel(Path("a\0b"))


# Whatever the file holds, a panel or a complaint on one line comes


TOKEN = re.compile(r'"[^"\n]*"|[A-Za-z_-]+|[0-9.]+|[^\S\n]+|\S|\n')
TEXTS = [RICH, *(path.read_text(encoding="utf-8") for path in SAMPLES)]
TOKENS = [TOKEN.findall(text) for text in TEXTS]
VALUES = [
    *("nan", "-inf", "true", "0", "-1", "1e308", "1e-308", "1e400", "9" * 5000),
    *("[]", "{}", "[[]]", "{ a = 1 }", "1979-05-27", "[" * 2000, "0x" + "f" * 5000),
    *('""', '" "', '"10"', '"0 mm"', '"-5 mm"', '"1e999 mm"', '"5 degC"', '"\\n"'),
    *(
        '"5 kPa up"',
        '"disc 5 mm"',
        '"1 mm x 2 mm"',
        '"span/0"',
        '"guided"',
        '"\\u2028"',
    ),
    *("[zone]\n", "[[ask]]\n", "\0", "\x7f", '"' + "x" * 300 + '"', "[1, 2]"),
    "[[0, 0], [1, 1], [1, 0], [0, 1]]",
    "[[0, 0], [0, 0], [0, 0]]",
    "[[0, 0], [1e-300, 0], [0, 1e-300]]",
    "[[0, 0], [1e15, 0], [0, 1]]",
    "{ centre = [0, 0], radius = 1e-9 }",
    "{ centre = [300, 300], size = [1e-3, 1e3] }",
    "{ centre = [300, 300], length = 60, width = 59.9999999 }",
    "{ from = [0, 0], through = [1, 1] }",
    *('"+x"', '"top"', '"100 N m/m"', '"40 %"', '"100 %"', '"arc"', '"polygon"'),
    *('"guided"', '"weir"', '"hinge"', '"rib"', '"pin"', '"doubler"', '"a.dxf"'),
    '"../../x.csv"',
]


@st.composite
def spoiled_files(draw: st.DrawFn) -> str:
    """Draw a sample file with tokens dropped, doubled, replaced or typed over."""
    tokens = list(draw(st.sampled_from(TOKENS)))
    for _ in range(draw(st.integers(1, 4))):
        i = draw(st.integers(0, len(tokens) - 1))
        how = draw(
            st.sampled_from(["drop", "double", "value", "value", "token", "type"])
        )
        if how == "drop":
            tokens[i] = ""
        elif how == "double":
            tokens[i] *= 2
        elif how == "value":
            tokens[i] = draw(st.sampled_from(VALUES))
        elif how == "token":
            tokens[i] = draw(st.sampled_from(tokens))
        else:
            cut = draw(st.integers(0, len(tokens[i])))
            typed = draw(st.text(max_size=3))
            tokens[i] = tokens[i][:cut] + typed + tokens[i][cut:]
    return "".join(tokens)


def panel_or_complaint(path: Path) -> Panel | InputError:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", KplateWarning)
        try:
            return read_panel(path)
        except InputError as error:
            return error


@settings(
    max_examples=400,
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
@given(text=spoiled_files())
def test_a_spoiled_file_gives_a_panel_or_one_line(tmp_path, text):
    path = tmp_path / "panel.toml"
    path.write_bytes(text.encode("utf-8", errors="surrogatepass"))
    found = panel_or_complaint(path)
    if isinstance(found, InputError):
        message = str(found).replace(str(path), "panel.toml")
        assert len(message.splitlines()) == 1
        assert len(message) < 300
    else:
        assert found.cases
