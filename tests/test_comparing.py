"""Two records side by side: what changed, by how much, and what is worse."""

import copy
import json
from pathlib import Path

import pytest

from kplate.check import check
from kplate.cli import main
from kplate.comparing import compare
from kplate.errors import InputError

MESHES = Path(__file__).parents[1] / "meshes"


@pytest.fixture(scope="module")
def record(tmp_path_factory):
    out = tmp_path_factory.mktemp("old")
    check(MESHES / "pit-cover.toml", out=out)
    return out / "pit-cover.json"


@pytest.fixture(scope="module")
def thinner(tmp_path_factory):
    out = tmp_path_factory.mktemp("new")
    text = (MESHES / "pit-cover.toml").read_text("utf-8")
    text = text.replace('"6 mm"', '"5 mm"').replace("span/200", "span/400")
    (out / "pit-cover.toml").write_text(text, "utf-8")
    check(out / "pit-cover.toml", out=out)
    return out / "pit-cover.json"


def changed(record, tmp_path, change):
    """A copy of a record in which something is changed."""
    own = json.loads(record.read_text("utf-8"))
    change(own)
    path = tmp_path / "changed.json"
    path.write_text(json.dumps(own), "utf-8")
    return path


def by_name(changes):
    return {own.what: own for own in changes}


def test_a_record_is_the_same_as_itself(record, capsys):
    assert main(["compare", str(record), str(record)]) == 0
    out = capsys.readouterr().out
    for part in ("stated", "found", "used"):
        assert f"{part}: nothing changed" in out
    assert out.endswith("verdict, old and new: passes\n")


def test_a_thinner_plate_changes_as_the_laws_say(record, thinner, capsys):
    """W goes with h^-3, stress with h^-2; forces do not change."""
    found = compare(record, thinner)
    stated = by_name(found.stated)
    assert (stated["thickness"].old, stated["thickness"].new) == (0.006, 0.005)
    assert stated["limit on peak deflection"].share == pytest.approx(-0.5)
    assert stated["limit on peak deflection"].unit == "m"
    assert set(stated) == {"thickness", "mass", "limit on peak deflection"}
    numbers = by_name(found.found)
    w = numbers["wheel, peak deflection"]
    assert w.share == pytest.approx((6 / 5) ** 3 - 1.0, rel=1e-6)
    assert not w.within_bands
    assert numbers["wheel, peak von Mises"].share == pytest.approx(0.44, rel=1e-3)
    assert not any(
        "force" in what for what in numbers if abs(numbers[what].share) > 0.01
    )
    used = by_name(found.judged)
    assert used["outcome of wheel, peak deflection"].new == "fails"
    assert used["theory"].new == "holds, conservative"
    assert main(["compare", str(record), str(thinner)]) == 1
    out = capsys.readouterr().out
    assert "thickness                 6.000 mm  5.000 mm  -16.7 %" in out
    assert out.endswith("verdict: passes -> fails: peak deflection (worse)\n")
    assert main(["compare", str(thinner), str(record)]) == 0
    assert "(worse)" not in capsys.readouterr().out


def test_a_change_that_both_bands_allow_is_marked(record, tmp_path):
    def move(own):
        peak = own["results"][0]["peaks"]["von Mises [Pa]"]
        peak["value"] = peak["upper"]

    def leap(own):
        peak = own["results"][0]["peaks"]["von Mises [Pa]"]
        for key in ("value", "lower", "upper"):
            peak[key] *= 1.5

    (small,) = compare(record, changed(record, tmp_path, move)).found
    assert small.what == "uniform, peak von Mises"
    assert small.within_bands
    (large,) = compare(record, changed(record, tmp_path, leap)).found
    assert not large.within_bands
    assert large.share == pytest.approx(0.5)


def test_cases_are_matched_by_their_names(record, tmp_path):
    def turn(own):
        own["results"].reverse()
        own["statement"]["cases"].reverse()
        own["verdict"]["judgements"].reverse()

    same = compare(record, changed(record, tmp_path, turn))
    assert (same.stated, same.found, same.judged) == ((), (), ())

    def rename(own):
        own["results"][1]["case"] = own["statement"]["cases"][1]["name"] = "cart"

    other = compare(record, changed(record, tmp_path, rename))
    assert by_name(other.stated)["cases wheel"].new is None
    assert by_name(other.stated)["cases cart"].old is None
    assert "gone" in other.text
    assert "added" in other.text


def test_supports_loads_and_places_are_named(record, tmp_path):
    def change(own):
        statement = own["statement"]
        statement["supports"]["south"]["name"] = "clamped"
        statement["cases"][1]["loads"][0]["force [N]"] = -2000.0
        statement["cases"][1]["loads"][0]["centre [m]"] = [0.5, 0.3]

    found = compare(record, changed(record, tmp_path, change))
    stated = by_name(found.stated)
    assert stated["supports south name"].new == "clamped"
    load = next(own for own in found.stated if own.unit == "N")
    assert load.what.startswith("cases wheel loads")
    assert load.share == pytest.approx(1.0 / 3.0)
    assert "(400, 300) mm" in found.text
    assert "(500, 300) mm" in found.text


@pytest.mark.parametrize(
    ("old", "new", "status"),
    [
        ("passes", "passes, 2 places to judge", 0),
        ("passes", "not proven: a band straddles its limit", 1),
        ("not proven: a band straddles its limit", "fails: peak deflection", 1),
        ("fails: peak deflection", "not proven: a band straddles its limit", 0),
    ],
)
def test_the_status_says_whether_the_verdict_is_worse(
    record, tmp_path, old, new, status
):
    paths = []
    for k, words in enumerate((old, new)):
        own = json.loads(record.read_text("utf-8"))
        own["verdict"]["words"] = words
        paths.append(tmp_path / f"{k}.json")
        paths[-1].write_text(json.dumps(own), "utf-8")
    assert compare(*paths).status == status


BROKEN = {
    "no table": "[1, 2]",
    "no JSON": "{",
    "nothing": "",
    "not text": b"\xff\xfe",
    "no results": '{"panel": {}, "statement": {}, "verdict": {}}',
    "deep": "[" * 100_000,
    "other": '{"panel": {}, "statement": {}, "results": [], "verdict": {"words": 3}}',
    "judged": '{"panel": {}, "statement": {}, "results": [], "verdict": {"words": "",'
    ' "judgements": [3]}}',
    "result": '{"panel": {}, "statement": {}, "results": [3], "verdict": {"words": "",'
    ' "judgements": []}}',
}


@pytest.mark.parametrize("name", BROKEN)
def test_what_is_no_record_is_refused_in_one_line(record, tmp_path, capsys, name):
    path = tmp_path / "broken.json"
    text = BROKEN[name]
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    assert main(["compare", str(path), str(record)]) == 2
    error = capsys.readouterr().err
    assert error.count("\n") == 1
    assert "is no record" in error
    assert "kplate check wrote" in error or "that it wrote" in error
    assert main(["compare", str(record), str(path)]) == 2


def test_files_that_are_not_there_are_refused(record, tmp_path, capsys):
    assert main(["compare", str(record), str(tmp_path / "none.json")]) == 2
    assert "No such file" in capsys.readouterr().err
    with pytest.raises(InputError, match="is a folder; name a record"):
        compare(tmp_path, record)


def test_records_with_odd_parts_do_not_fall_over(record, tmp_path):
    """Every leaf, one after the other, replaced by something else."""
    whole = json.loads(record.read_text("utf-8"))
    for key in whole["verdict"]["judgements"][0]:
        own = copy.deepcopy(whole)
        own["verdict"]["judgements"][0][key] = None
        path = tmp_path / "odd.json"
        path.write_text(json.dumps(own), "utf-8")
        assert compare(record, path).text
        assert compare(path, record).text
    for key in whole["results"][0]["reactions"]:
        own = copy.deepcopy(whole)
        own["results"][0]["reactions"][key] = [1, None, {"force [N]": "odd"}]
        path.write_text(json.dumps(own), "utf-8")
        assert compare(record, path).text
