import pytest

from server.metrology.coverage import coverage_factor, printed_factor


@pytest.mark.parametrize(
    ("dof", "t"),
    [(1, 12.71), (2, 4.30), (4, 2.78), (9, 2.26), (16, 2.12), (50, 2.01), (None, 1.960)],
)
def test_coverage_factor_is_the_guide_s_table(dof, t):
    # JCGM 100:2008, table G.2, column 95 %
    assert coverage_factor(dof, 0.95) == pytest.approx(t, abs=0.0051)


def test_coverage_factor_broken_dof_lies_between_whole_ones():
    assert coverage_factor(5.0, 0.95) < coverage_factor(4.3, 0.95) < coverage_factor(4.0, 0.95)


def test_printed_factor_never_falls_below_two():
    assert printed_factor(None, 0.95) == 2.0
    assert printed_factor(4.0, 0.95) == pytest.approx(2.776, abs=5e-4)
