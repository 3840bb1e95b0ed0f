"""What is taken as machine code of the kernel, and what it is handed. The rules are our own."""

from __future__ import annotations

import json

import numpy as np
import pytest

from stagebook.engine.kernel import machine_code
from stagebook.engine.kernel.machine_code import adopt, bound, flattened, packed


@pytest.fixture(autouse=True)
def _unloaded(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(machine_code, "_loaded", None)


def altered(**head: object) -> bytes:
    line, _, rest = packed([]).partition(b"\n")
    return json.dumps({**json.loads(line), **head}).encode() + b"\n" + rest


@pytest.mark.parametrize(
    ("code", "words"),
    [
        (b"", "no machine code"),
        (b"\xff\xfe\n\x00", "no machine code"),
        (b"[]\n", "no machine code"),
        (altered(processor="another"), "another processor"),
        (altered(format=0), "another processor"),
        (altered() + b"x", "damaged"),
    ],
)
def test_only_whole_code_for_this_processor_is_taken(code: bytes, words: str) -> None:
    with pytest.raises(ValueError, match=words):
        adopt(code)
    assert not machine_code.loaded()


def test_a_table_holds_addresses_shapes_and_numbers_in_their_order() -> None:
    numbers, places = np.zeros((2, 3)), np.zeros(4, dtype=np.uint32)
    table, kinds = flattened(((numbers, (places,)), 7))
    assert list(table) == [numbers.ctypes.data, 2, 3, places.ctypes.data, 4, 7]
    assert kinds == "f8:2 u4:1 number"


def test_what_is_flattened_already_is_taken_as_it_is() -> None:
    numbers = np.zeros((2, 3))
    flat = machine_code.Flat((numbers, 5))
    assert flat.value[0] is numbers
    table, kinds = flattened((1, flat, 2))
    assert list(table) == [1, numbers.ctypes.data, 2, 3, 5, 2]
    assert kinds == "number f8:2 number number"


def test_an_array_with_gaps_is_refused() -> None:
    with pytest.raises(ValueError, match="contiguous"):
        flattened((np.zeros((4, 4))[:, ::2],))


@pytest.mark.parametrize(
    "arguments", [(np.zeros(3, dtype=np.int32),), (np.zeros((3, 1)),), (np.zeros(3), 1), ()], ids=str
)
def test_what_an_entry_does_not_take_never_reaches_it(
    arguments: tuple[object, ...], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(machine_code, "_loaded", {"one": machine_code.Entry(pytest.fail, "f8:1", None)})
    with pytest.raises(ValueError, match="the kernel's one takes f8:1, not"):
        bound("one", arguments)
