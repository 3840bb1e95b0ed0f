"""Patches between JSON documents, against RFC 6902 (JSON Patch, 2013) and RFC 6901 (JSON Pointer, 2013)."""

from __future__ import annotations

import copy
import json
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from stagebook.storage.patch import difference, patched

DOCUMENTS = st.recursive(
    st.none()
    | st.booleans()
    | st.integers(-2, 2)
    | st.sampled_from([0.0, -0.0, 1.0, 0.5])
    | st.text("a~/01", max_size=3),
    lambda inner: st.lists(inner, max_size=5) | st.dictionaries(st.text("ab~/01", max_size=2), inner, max_size=4),
    max_leaves=20,
)


def written(document: Any) -> str:
    """What tells documents apart: 1, 1.0 and true differ, the order of keys does not count."""
    return json.dumps(document, sort_keys=True)


@given(DOCUMENTS, DOCUMENTS)
def test_a_difference_leads_from_one_document_to_the_other_and_back(before: Any, after: Any) -> None:
    was = copy.deepcopy(before)
    assert written(patched(before, difference(before, after))) == written(after)
    assert written(patched(after, difference(after, before))) == written(before)
    assert written(before) == written(was)


@given(DOCUMENTS)
def test_no_difference_is_no_operation(document: Any) -> None:
    assert difference(document, copy.deepcopy(document)) == []


@pytest.mark.parametrize(
    ("before", "patch", "after"),
    [
        # RFC 6902, appendix A.1 to A.5, A.10 and A.14
        ({"foo": "bar"}, [{"op": "add", "path": "/baz", "value": "qux"}], {"baz": "qux", "foo": "bar"}),
        ({"foo": ["bar", "baz"]}, [{"op": "add", "path": "/foo/1", "value": "qux"}], {"foo": ["bar", "qux", "baz"]}),
        ({"baz": "qux", "foo": "bar"}, [{"op": "remove", "path": "/baz"}], {"foo": "bar"}),
        ({"foo": ["bar", "qux", "baz"]}, [{"op": "remove", "path": "/foo/1"}], {"foo": ["bar", "baz"]}),
        (
            {"baz": "qux", "foo": "bar"},
            [{"op": "replace", "path": "/baz", "value": "boo"}],
            {"baz": "boo", "foo": "bar"},
        ),
        ({"foo": "bar"}, [{"op": "add", "path": "/child", "value": {"g": {}}}], {"foo": "bar", "child": {"g": {}}}),
        ({"/": 9, "~1": 10}, [{"op": "replace", "path": "/~01", "value": 11}], {"/": 9, "~1": 11}),
        # RFC 6901, section 5: "" is the whole document, "/" the member with an empty name
        ({"": 0}, [{"op": "replace", "path": "/", "value": 1}], {"": 1}),
        ({"": 0}, [{"op": "replace", "path": "", "value": 1}], 1),
    ],
)
def test_published_examples(before: Any, patch: list[dict[str, Any]], after: Any) -> None:
    assert patched(before, patch) == after
    assert patched(before, difference(before, after)) == after


@pytest.mark.parametrize(
    "operation",
    [
        {"op": "add", "path": "/baz/bat", "value": "qux"},  # RFC 6902, A.12
        {"op": "remove", "path": "/baz"},  # section 4.2: the target must exist
        {"op": "replace", "path": "/baz", "value": 1},  # section 4.3: the target must exist
        {"op": "add", "path": "/list/3", "value": 1},  # section 4.1: not past the end
        {"op": "remove", "path": "/list/2"},
        {"op": "remove", "path": "/list/-1"},
        {"op": "remove", "path": "/foo/0"},
        {"op": "remove"},
    ],
)
def test_what_does_not_fit_is_refused(operation: dict[str, Any]) -> None:
    document = {"foo": "bar", "list": [1, 2]}
    with pytest.raises(ValueError, match="does not fit"):
        patched(document, [operation])


def test_a_part_taken_out_of_many_is_one_operation() -> None:
    parts = [{"ref": f"R{n}", "value": "10k"} for n in range(9)]
    assert difference({"parts": parts}, {"parts": parts[:4] + parts[5:]}) == [{"op": "remove", "path": "/parts/4"}]


def test_a_changed_value_is_one_operation() -> None:
    before = {"parts": [{"ref": "R8", "value": "330k"}, {"ref": "C4", "value": "220u"}]}
    after = {"parts": [{"ref": "R8", "value": "470k"}, {"ref": "C4", "value": "220u"}]}
    assert difference(before, after) == [{"op": "replace", "path": "/parts/0/value", "value": "470k"}]
