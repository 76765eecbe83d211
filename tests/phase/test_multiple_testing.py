import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from unitclass.phase.multiple_testing import benjamini_hochberg

# Benjamini & Hochberg 1995, section 3.2.
P = [.0001, .0004, .0019, .0095, .0201, .0278, .0298, .0344, .0459, .3240, .4262, .5719, .6528, .7590, 1]
Q = [.0015, .003, .0095, .035625, .0603, .06386, .06386, .0645, .0765, .486, .58118, .71487, .75323, .81321, 1]


def test_the_example_of_benjamini_and_hochberg_is_reproduced():
    q = benjamini_hochberg(P)
    np.testing.assert_allclose(q, Q, atol=5.1e-6)
    assert (q <= 0.05).sum() == 4


@given(st.lists(st.floats(0, 1, allow_subnormal=False), max_size=30))
def test_q_equals_statsmodels_and_scipys_in_any_order(p):
    q = benjamini_hochberg(p)
    if p:
        multipletests = pytest.importorskip("statsmodels.stats.multitest").multipletests
        np.testing.assert_allclose(q, multipletests(p, method="fdr_bh")[1])
        np.testing.assert_allclose(q, pytest.importorskip("scipy.stats").false_discovery_control(p))
        assert (q >= np.array(p) - 1e-12).all()
    assert q.shape == (len(p),)


def test_nan_is_no_test():
    np.testing.assert_array_equal(benjamini_hochberg([0.01, np.nan, 0.04]), [0.02, np.nan, 0.04])


def test_values_that_are_no_probabilities_are_refused():
    with pytest.raises(ValueError, match="between 0 and 1"):
        benjamini_hochberg([0.1, 1.2])
