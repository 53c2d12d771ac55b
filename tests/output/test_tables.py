"""The table that a command prints."""

from kplate.output.tables import Line, band, legend, values_table
from kplate.units import Unit
from kplate.values import Value

MM = Unit("mm", 1e-3)


def line(value, **options):
    return Line(
        case="wheel", quantity="peak deflection", value=value, unit=MM, **options
    )


def test_a_line_shows_value_band_limit_use_and_place():
    value = Value(value=-1.657e-3, kind="estimate", lower=-1.66e-3, upper=-1.655e-3)
    table = values_table([line(value, limit=3e-3, where="(400, 300) mm, down")])
    assert table.splitlines() == [
        "case   quantity         value     band      limit     used  where",
        "wheel  peak deflection  1.657 mm  0.18 % ~  3.000 mm  0.55  "
        "(400, 300) mm, down",
    ]


def test_a_number_without_band_or_limit_says_so():
    table = values_table([line(Value(value=1e-3))])
    assert "1.000 mm  not estimated  -" in table


def test_marks_tell_the_kinds_of_band_apart():
    ends = {"lower": 0.9, "upper": 1.1}
    assert band(Value(value=1.0, kind="bound", **ends)) == "10 %"
    assert band(Value(value=1.0, kind="estimate", **ends)) == "10 % ~"
    assert band(Value(value=1.0, kind="indicator", **ends)) == "10 % ?"
    assert band(Value(value=1.0)) == "not estimated"
    assert band(Value(value=0.0, kind="bound", lower=-1.0, upper=0.5)) == "+-1"
    assert legend([line(Value(value=1.0))]) == ""
    assert legend([line(Value(value=1.0, kind="bound", **ends))]) == (
        "no mark: bound   ~ estimate   ? indicator"
    )


def test_names_with_brackets_are_printed_as_they_are():
    value = Value(value=1e-3)
    odd = Line(case="[bold]wheel[/bold]", quantity="w", value=value, unit=MM)
    assert "[bold]wheel[/bold]" in values_table([odd])


def test_long_lines_are_not_folded():
    table = values_table([line(Value(value=1e-3), where="x" * 150)])
    assert len(table.splitlines()) == 2
