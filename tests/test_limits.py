"""Utilisation and verdicts."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kplate.errors import InputError
from kplate.limits import (
    DeflectionLimit,
    Judgement,
    Limits,
    Outcome,
    StressLimit,
    Verdict,
    governing,
)
from kplate.values import Value


def judged(value, limit, **band):
    return Judgement(quantity="peak", value=Value(value=value, **band), limit=limit)


def test_a_number_without_a_band_is_judged_as_it_is():
    judgement = judged(-1.5, 3.0)
    assert judgement.used == 0.5
    verdict = Verdict(judgements=(judgement,))
    assert verdict.outcome is Outcome.PASSES
    assert verdict.words == "passes, bands not estimated"
    assert Verdict(judgements=(judged(-3.5, 3.0),)).words == "fails: peak"


def test_a_band_is_judged_at_its_unfavourable_end():
    band = {"kind": "bound", "lower": -3.2, "upper": -2.9}
    straddles = judged(-3.0, 3.1, **band)
    assert straddles.used == pytest.approx(3.2 / 3.1)
    assert straddles.outcome is Outcome.NOT_PROVEN
    assert Verdict(judgements=(straddles,)).words == (
        "not proven: a band straddles its limit"
    )
    assert judged(-3.0, 3.2, **band).outcome is Outcome.PASSES
    assert judged(-3.0, 2.8, **band).outcome is Outcome.FAILS
    assert Verdict(judgements=(judged(-3.0, 4.0, **band),)).words == "passes"


def test_places_left_out_are_counted_in_the_verdict():
    judgement = judged(1.0, 2.0)
    one = Verdict(judgements=(judgement,), to_judge=1)
    assert one.words == "passes, bands not estimated, 1 place to judge"
    assert one.outcome is Outcome.PASSES
    assert Verdict(judgements=(judgement,), to_judge=3).words.endswith(
        "3 places to judge"
    )


def test_nothing_stated_is_nothing_judged():
    verdict = Verdict(judgements=())
    assert verdict.words == "no limit stated: nothing judged"
    assert governing(verdict.judgements) is None


@given(st.floats(-10, 10), st.floats(0, 5), st.floats(0, 5), st.floats(0.1, 10))
def test_outcome_agrees_with_both_ends_of_the_band(value, below, above, limit):
    judgement = judged(
        value, limit, kind="bound", lower=value - below, upper=value + above
    )
    inside = max(abs(value - below), abs(value + above)) <= limit
    crosses = value - below <= limit and value + above >= -limit
    expected = (
        Outcome.PASSES if inside else Outcome.NOT_PROVEN if crosses else Outcome.FAILS
    )
    assert judgement.outcome is expected
    assert (judgement.used <= 1.0) == inside


def test_the_largest_utilisation_governs():
    first, second = judged(1.0, 2.0), judged(4.0, 5.0)
    assert governing([first, second]) is second
    assert Verdict(judgements=(first, judged(9.0, 5.0))).outcome is Outcome.FAILS


def test_limits_are_checked():
    with pytest.raises(InputError) as caught:
        DeflectionLimit(at_most=-0.003)
    assert str(caught.value) == (
        "the deflection limit is -0.003; it must be a positive number."
    )
    with pytest.raises(InputError) as caught:
        StressLimit(criterion="Tresca", strength=235e6)
    assert str(caught.value) == (
        "stress criterion 'Tresca'; it must be one of von Mises, largest principal."
    )
    with pytest.raises(InputError, match="the hold-down limit is 0"):
        Limits(hold_down=0.0)
    limit = StressLimit(criterion="von Mises", strength=235e6, factor=1.5)
    assert limit.at_most == pytest.approx(156.67e6, rel=1e-4)


def test_a_band_fits_its_kind():
    with pytest.raises(InputError, match="give both ends, or neither with 'none'"):
        Value(value=1.0, kind="bound")
    with pytest.raises(InputError, match="give both ends, or neither with 'none'"):
        Value(value=1.0, lower=0.5, upper=1.5)
    with pytest.raises(InputError, match="does not hold its value"):
        Value(value=1.0, kind="estimate", lower=1.1, upper=1.5)
    with pytest.raises(InputError, match="a band has two ends"):
        Value(value=1.0, kind="estimate", lower=0.5)
