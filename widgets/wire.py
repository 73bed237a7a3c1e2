"""Messages between kernel and browser: a plain dict, and arrays as binary buffers, with a version.

A message is ``{"wire": 1, "kind": ..., "arrays": [{"name", "type", "shape", "packed"}, ...], ...fields}`` with one
buffer an array, little-endian, C order. Arrays of more than 64 kB are deflated (``packed: "deflate"``, the zlib
format), smaller ones are sent as they are (``packed: ""``). ``front/wire.js`` is the browser's half.
"""

from __future__ import annotations

import zlib
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault

__all__ = ["WIRE_VERSION", "plain", "receive", "send"]

WIRE_VERSION = 1
_TYPES = {"uint8", "int16", "uint16", "int32", "uint32", "float32"}
_DEFLATE_FROM = 65_536


def send(
    kind: str, arrays: Mapping[str, NDArray[Any]] | None = None, **fields: Any
) -> tuple[dict[str, Any], list[bytes]]:
    """A message and its buffers.

    Parameters
    ----------
    kind : str
        What the message is.
    arrays : mapping of str to array, optional
        uint8, int16, uint16, int32, uint32 or float32; bool is sent as uint8.
    **fields
        Anything :func:`plain` takes.

    Raises
    ------
    TypeError
        If an array is of another type.

    Examples
    --------
    >>> message, buffers = send("patch", {"bits": np.arange(3, dtype=np.uint8)}, revision=4)
    >>> message["arrays"], bytes(buffers[0])
    ([{'name': 'bits', 'type': 'uint8', 'shape': [3], 'packed': ''}], b'\\x00\\x01\\x02')
    """
    heads, buffers = [], []
    for name, array in (arrays or {}).items():
        values = array.view(np.uint8) if array.dtype == np.bool_ else array
        if values.dtype.name not in _TYPES:
            raise TypeError(f"{name}: {values.dtype} does not travel; one of {', '.join(sorted(_TYPES))} does")
        values = np.ascontiguousarray(values, values.dtype.newbyteorder("<"))
        packed = values.nbytes > _DEFLATE_FROM
        heads.append({"name": name, "type": values.dtype.name, "shape": list(values.shape),
                      "packed": "deflate" if packed else ""})  # fmt: skip
        buffers.append(zlib.compress(values.reshape(-1).view(np.uint8).data, 1) if packed else values.tobytes())
    return {"wire": WIRE_VERSION, "kind": kind, "arrays": heads, **plain(fields)}, buffers


def receive(message: Mapping[str, Any], buffers: Sequence[Any]) -> dict[str, NDArray[Any]]:
    """The arrays of a message, by name.

    Raises
    ------
    BywayError
        If the message is of another version, or its buffers do not fit what it says of them.
    """
    if message.get("wire") != WIRE_VERSION:
        raise BywayError(Fault("wire-version", "message", f"version {message.get('wire')}", str(WIRE_VERSION),
                               "reload the page"))  # fmt: skip
    arrays = {}
    for head, buffer in zip(message.get("arrays", ()), buffers, strict=True):
        if head["type"] not in _TYPES:
            raise BywayError(Fault("wire-type", f"array {head['name']}", str(head["type"]), ", ".join(sorted(_TYPES))))
        raw = zlib.decompress(buffer) if head["packed"] else bytes(buffer)
        values = np.frombuffer(raw, np.dtype(head["type"]).newbyteorder("<"))
        if values.size != int(np.prod(head["shape"])):
            raise BywayError(Fault("wire-shape", f"array {head['name']}", f"{values.size} values", str(head["shape"])))
        arrays[head["name"]] = values.reshape(head["shape"])
    return arrays


def plain(value: Any) -> Any:
    """Plain JSON values: numpy scalars and arrays become numbers and lists, NaN and infinities become None.

    >>> plain({"share": np.float32(0.5), "low": float("nan"), "box": (1, 2)})
    {'share': 0.5, 'low': None, 'box': [1, 2]}
    """
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, np.ndarray):
        return plain(value.tolist())
    if isinstance(value, list | tuple | set | frozenset):
        return [plain(item) for item in value]
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float) and not np.isfinite(value):
        return None
    return value
