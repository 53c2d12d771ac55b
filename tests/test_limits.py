"""Utilisation and verdicts."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kplate.errors import InputError
from kplate.limits import (
    DeflectionLimit,
    Judgement,
    Outcome,
    ReactionLimit,
    StepLimit,
    StressLimit,
    StressRangeLimit,
    Verdict,
    governing,
    worst,
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
        StressLimit(criterion="Rankine", strength=235e6)
    assert str(caught.value) == (
        "stress criterion 'Rankine'; it must be one of von Mises, Tresca, largest "
        "principal."
    )
    with pytest.raises(InputError, match="the hold-down limit is 0"):
        ReactionLimit(at="corners", sense="hold-down", at_most=0.0)
    with pytest.raises(InputError, match="limit of the step along north is nan"):
        StepLimit(along="north", at_most=float("nan"))
    with pytest.raises(InputError, match="stress range of 'm_xx'; it must be one of"):
        StressRangeLimit(of="m_xx", at_most=1e6)
    with pytest.raises(InputError, match="corners have no names"):
        ReactionLimit(at="corners", sense="bearing", at_most=1.0, only=["south"])
    limit = StressLimit(criterion="von Mises", strength=235e6, factor=1.5)
    assert limit.allowed(0.006) == pytest.approx(156.67e6, rel=1e-4)


def test_a_strength_that_goes_by_thickness_is_looked_up():
    grades = ((0.016, 235e6), (0.040, 225e6))
    limit = StressLimit(
        criterion="von Mises",
        strength=235e6,
        factor=1.1,
        grades=grades,
        words="S235",
    )
    found = [limit.strength_at(h) for h in (0.003, 0.016, 0.0161, 0.04)]
    assert found == [235e6, 235e6, 225e6, 225e6]
    assert limit.allowed(0.02) == pytest.approx(225e6 / 1.1)
    with pytest.raises(InputError) as caught:
        limit.allowed(0.05)
    assert str(caught.value) == (
        "a thickness of 50 mm has no strength in S235, which end at 40 mm; state the "
        "strength."
    )


def test_what_fails_is_worse_than_what_is_not_known_or_much_used():
    fails, tight = judged(3.1, 3.0), judged(2.99, 3.0)
    lost = Judgement(quantity="peak", value=Value(value=float("nan")), limit=3.0)
    assert worst([tight, lost, fails]) is fails
    assert worst([tight, lost]) is lost
    assert worst([judged(1.0, 3.0), tight]) is tight
    assert worst([]) is None


def test_a_band_fits_its_kind():
    with pytest.raises(InputError, match="give both ends, or neither with 'none'"):
        Value(value=1.0, kind="bound")
    with pytest.raises(InputError, match="give both ends, or neither with 'none'"):
        Value(value=1.0, lower=0.5, upper=1.5)
    with pytest.raises(InputError, match="does not hold its value"):
        Value(value=1.0, kind="estimate", lower=1.1, upper=1.5)
    with pytest.raises(InputError, match="a band has two ends"):
        Value(value=1.0, kind="estimate", lower=0.5)
