"""Messages and their buffers."""

from __future__ import annotations

import json
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from byway.knowledge.faults import BywayError
from byway.widgets.wire import plain, receive, send

types = st.sampled_from(["uint8", "int16", "uint16", "int32", "uint32", "float32"])
arrays = types.flatmap(lambda kind: hnp.arrays(kind, hnp.array_shapes(max_dims=3, max_side=6)))


@given(arrays)
def test_what_is_sent_is_received(array: np.ndarray[Any, Any]) -> None:
    """Values, type and shape survive, and the message is plain JSON."""
    message, buffers = send("test", {"a": array}, revision=3)
    assert json.loads(json.dumps(message))["revision"] == 3
    got = receive(message, buffers)["a"]
    assert got.dtype.name == array.dtype.name
    assert got.shape == array.shape
    assert got.tobytes() == np.ascontiguousarray(array).tobytes()


def test_large_arrays_are_deflated_and_slices_travel() -> None:
    """An array above 64 kB is sent deflated; a view that is not contiguous is sent in C order."""
    volume = np.arange(100_000, dtype=np.uint32).reshape(10, 100, 100)
    message, buffers = send("test", {"whole": volume, "part": volume[:, ::7, 3]})
    assert [head["packed"] for head in message["arrays"]] == ["deflate", ""]
    assert len(buffers[0]) < volume.nbytes
    got = receive(message, [memoryview(b) for b in buffers])
    assert np.array_equal(got["whole"], volume)
    assert np.array_equal(got["part"], volume[:, ::7, 3])


def test_bool_travels_as_bytes() -> None:
    """A mask is sent as zeros and ones."""
    message, buffers = send("test", {"mask": np.array([True, False])})
    assert receive(message, buffers)["mask"].tolist() == [1, 0]


def test_other_types_are_refused() -> None:
    """A float64 array does not travel silently as something else."""
    with pytest.raises(TypeError, match="float64"):
        send("test", {"a": np.zeros(3)})


HEAD = {"name": "a", "type": "uint8", "shape": [3], "packed": ""}


@pytest.mark.parametrize(
    "change", [{"wire": 2}, {"arrays": [{**HEAD, "type": "object"}]}, {"arrays": [{**HEAD, "shape": [4]}]}]
)
def test_a_message_that_does_not_fit_is_refused(change: dict[str, Any]) -> None:
    """Another version, an unknown type or a wrong length raises a fault in words."""
    message, buffers = send("test", {"a": np.zeros(3, np.uint8)})
    with pytest.raises(BywayError, match="expected"):
        receive({**message, **change}, buffers)


def test_plain_has_no_nan() -> None:
    """What is not a number becomes null, which JSON has."""
    assert json.dumps(plain({"a": [np.float32("nan"), np.int64(3)], "b": np.array([1.5, np.inf])})) == (
        '{"a": [null, 3], "b": [1.5, null]}'
    )
