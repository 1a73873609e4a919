"""Wishes as written, and the marks, scores and ranks they give."""

import math

import numpy as np
import pytest

from bandwright.errors import QuantityError, StackError
from bandwright.wishes import Wish, ranks, read_wishes, scores


@pytest.mark.parametrize(
    ("given", "wish"),
    [
        (("near", 10.3), ("near", 10.3, 1.0)),
        (["near", 10.3, 2], ("near", 10.3, 2.0)),
        ("near 10.3", ("near", 10.3, 1.0)),
        (" near -1.5e1 , weight 0.5 ", ("near", -15.0, 0.5)),
        (("small", 3.0), ("small", None, 3.0)),
        ("large, weight 2", ("large", None, 2.0)),
        (Wish("near", 10.3, 2.0), ("near", 10.3, 2.0)),
        (Wish("small"), ("small", None, 1.0)),
    ],
)
def test_wishes_as_tuples_and_as_text(given, wish):
    found = read_wishes({"a": given})["a"]
    assert (found.kind, found.weight) == (wish[0], wish[2])
    assert math.isnan(found.target) if wish[1] is None else found.target == wish[1]


@pytest.mark.parametrize(
    ("wishes", "error", "says"),
    [
        ("large", StackError, "wishes: got 'large'; give a mapping such as"),
        ({}, StackError, "wishes: got {}; give a mapping"),
        ({"a": "larg"}, StackError, "wish for a: got 'larg'; did you mean 'large'"),
        ({"a": "near"}, StackError, "wish for a: got 'near'; write"),
        ({"a": ("near", 1, 2, 3)}, StackError, r"wish for a: got \('near', 1, 2, 3\); write"),
        ({"a": "near 10 um"}, StackError, "wish for a: got 'near 10 um'; write"),
        ({"a": 3}, StackError, "wish for a: got 3; write"),
        ({"a": ("near", "10 um")}, QuantityError, "target '10 um'; a number is due, in"),
        ({"a": "large, weight heavy"}, QuantityError, "wish for a: weight 'heavy'; a number"),
        ({"a": ("near", True)}, QuantityError, "wish for a: target True; a number is due"),
        ({"a": ("large", 0)}, QuantityError, "wish for a: weight 0; a weight must be above zero"),
    ],
)
def test_wishes_that_mean_nothing(wishes, error, says):
    with pytest.raises(error, match=says):
        read_wishes(wishes)


def test_no_wish_is_none():
    assert read_wishes(None) == {}


def test_marks():
    values = np.array([1.0, 3.0, 2.0, np.nan])
    assert Wish("large").marks(values).tolist() == [0.0, 1.0, 0.5, 0.0]
    assert Wish("small").marks(values).tolist() == [1.0, 0.0, 0.5, 0.0]
    assert Wish("near", 3.0).marks(values).tolist() == [0.0, 1.0, 0.5, 0.0]
    equal = np.array([2.0, 2.0, np.nan])
    for wish in (Wish("large"), Wish("small"), Wish("near", 2.0)):
        assert wish.marks(equal).tolist() == [1.0, 1.0, 0.0]
    assert Wish("small").marks(np.array([np.nan])).tolist() == [0.0]


def test_scores_are_weighted_means_and_equals_share_a_rank():
    wishes = {"a": Wish("large", weight=3.0), "b": Wish("small")}
    columns = {"a": np.array([0.0, 1.0, 1.0]), "b": np.array([0.0, 1.0, 0.0])}
    found = scores(wishes, columns)
    assert found.tolist() == [0.25, 0.75, 1.0]
    assert ranks(found) == [3, 2, 1]
    assert ranks(np.array([0.5, 0.5 + 1e-15, 0.1])) == [1, 1, 3]
