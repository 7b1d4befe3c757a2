"""LAPACK's bare routines: they work in place on stacked blocks, and other threads go on meanwhile.

SciPy's Python wrappers of the routines used here hold the interpreter's lock while they work; its interface for Cython
gives their addresses, at which ctypes calls them without the lock.
"""

from __future__ import annotations

import ctypes
import re
from collections.abc import Callable
from functools import cache
from typing import Any

import numpy as np
import scipy.linalg.cython_lapack as interface

from adjust.arrays import FloatArray, IntArray

Argument = str | int | IntArray | FloatArray


def for_each_block(name: str, blocks: int, *arguments: Argument) -> None:
    """Call a routine once for every block, with the arguments of LAPACK's documentation.

    Letters, whole numbers and flat arrays of floating-point numbers (work space) serve all blocks; flat arrays of whole
    numbers have one for each block, higher arrays of floating-point numbers a contiguous block, column by column.
    """
    call, whole = routine(name, len(arguments))
    memory = [as_memory(each, whole) for each in arguments]
    stepping = [isinstance(each, np.ndarray) and (each.ndim > 1 or each.dtype.kind == "i") for each in arguments]
    first = np.array([each.ctypes.data for each in memory])
    step = np.array([each.strides[0] if steps else 0 for each, steps in zip(memory, stepping, strict=True)])
    for addresses in first + np.arange(blocks)[:, None] * step:
        call(*addresses.tolist())


def as_memory(argument: Argument, whole: type[np.signedinteger[Any]]) -> np.ndarray[Any, Any]:
    """An argument as LAPACK reads it."""
    if isinstance(argument, str):
        return np.array([argument], dtype="S1")
    if isinstance(argument, int):
        return np.array([argument], dtype=whole)
    return argument.astype(whole) if argument.dtype.kind == "i" else argument


@cache
def routine(name: str, arguments: int) -> tuple[Callable[..., None], type[np.signedinteger[Any]]]:
    """A routine that takes the addresses of all its arguments, and the type of its whole numbers."""
    capsule: Any = vars(interface)["__pyx_capi__"][name]
    name_of, address_of = ctypes.pythonapi.PyCapsule_GetName, ctypes.pythonapi.PyCapsule_GetPointer
    name_of.restype, name_of.argtypes = ctypes.c_char_p, [ctypes.py_object]
    address_of.restype, address_of.argtypes = ctypes.c_void_p, [ctypes.py_object, ctypes.c_char_p]
    signature = name_of(capsule)
    call = ctypes.CFUNCTYPE(None, *[ctypes.c_void_p] * arguments)(address_of(capsule, signature))
    return call, np.intc if re.search(rb"\bint \*", signature) else np.int64
