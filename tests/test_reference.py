"""Numbers computed without finite elements, and figures in print, met by DKT.

The problems and their sources are those of ``python -m benchmarks``. Tolerances are the
largest discretisation errors measured at 6,000 triangles, rounded up.
"""

import pytest

from benchmarks import numbers, records

# Share of the reference value (or of 2 % of the largest of its kind, for small ones).
TOLERANCE = {
    "deflection": 0.004,
    "m_xx": 0.02,
    "m_yy": 0.03,  # the tangential moment on a clamped curved rim
    "m_xy": 0.01,
    "moment": 0.02,
    "corner force": 0.005,
    "line reaction": 0.03,
    "shear": 0.12,  # of smoothed moments, on a side
}
PROBLEMS = [
    "ssss_u_1",
    "ssss_u_2",
    "ssss_h_1",
    "ssss_patch_1",
    "cccc_u_1",
    "cccc_u_2",
    "cccc_h_1",
    "csss_u_1",
    "ssfs_u_1",
    "csfs_u_1",
    "cfff_u_1",
    "ccfc_u_1",
    "tri_eq_s_u",
    "circ_C_u_nu0.3",
    "circ_S_u_nu0.3",
    "ann_0.5_iF_oS_u",
    "hole_ssss_0.15_0.5_F",
]


@pytest.mark.slow
@pytest.mark.parametrize("name", PROBLEMS)
def test_values_of_the_reference_file_are_met(name):
    problem = records.record(name)
    found = numbers.measure(problem, triangles=6_000, element="dkt").numbers
    assert len(found) == len(problem["quantities"])
    off = [
        f"{own.quantity}: {own.computed:.6g}, value {own.value:.6g}, {own.method}"
        for own in found
        if not abs(own.deviation) <= TOLERANCE[own.quantity]
    ]
    assert not off, "\n".join(off)


def test_the_problems_hold_more_than_a_hundred_numbers_with_their_sources():
    rows = [q for name in PROBLEMS for q in records.record(name)["quantities"]]
    assert len(rows) > 100
    assert all(q["source"] in records.reference()["sources"] for q in rows)
    assert sum(q.get("published") is not None for q in rows) >= 20
