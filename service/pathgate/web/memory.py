"""Gives back what a large request took.

A body of some megabytes becomes hundreds of thousands of small objects. Freed, they leave the C library's
heap in scattered pieces that it keeps for itself, and a worker would stay as large as its largest request
made it. After such a request the collector runs once and the heap is trimmed, where the C library can.
"""

from __future__ import annotations

import ctypes
import gc
from collections.abc import Callable
from functools import cache
from typing import cast

from flask import Response, request

# Bodies from this size on are worth the few milliseconds that giving back takes.
LARGE_BODY = 2_000_000
# Blocks from this size on are mapped one by one.
LARGE_BLOCK = 4 * 1024 * 1024

# Parameters of mallopt, from GNU's malloc.h.
_MMAP_THRESHOLD = -3
_ARENA_MAX = -8


def give_back_after(reply: Response) -> Response:
    """Have the memory of a large request given back once its reply is sent."""
    if (request.content_length or LARGE_BODY) >= LARGE_BODY and request.method == "POST":
        reply.call_on_close(_give_back)
    return reply


def _give_back() -> None:
    gc.collect()
    trim = _library_function("malloc_trim", (ctypes.c_size_t,))
    if trim is not None:
        trim(0)


def set_apart_what_stays() -> None:
    """Keep the collector from looking again and again at what was loaded for good; to be called before workers fork.

    Their copies of it then also stay shared.
    """
    gc.collect()
    gc.freeze()


def keep_heap_compact() -> None:
    """Have the C library put large blocks where they can be given back singly; to be called before threads start.

    Left alone, it raises its idea of "large" with every large block it sees, and gives each thread a heap of
    its own that it never trims. Where the library has no such knobs, nothing happens.
    """
    adjust = _library_function("mallopt", (ctypes.c_int, ctypes.c_int))
    if adjust is not None:
        adjust(_MMAP_THRESHOLD, LARGE_BLOCK)
        adjust(_ARENA_MAX, 1)


@cache
def _library_function(name: str, arguments: tuple[type, ...]) -> Callable[..., int] | None:
    """A function of the C library; only GNU's has those named here."""
    try:
        function = getattr(ctypes.CDLL(None), name)
    except (OSError, AttributeError):
        return None
    function.argtypes = list(arguments)
    function.restype = ctypes.c_int
    return cast("Callable[..., int]", function)
