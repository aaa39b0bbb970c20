"""How long a replay and a build take; one round each, no luck."""

from __future__ import annotations

import time

import numpy as np
import pytest
from arithmetic_simulators import replay

from placer.program.signature import Signature
from placer.recipes.arithmetic import build

INPUTS = 100_032
"""A whole number of machine words, at least 10^5."""


@pytest.mark.bench
def test_replay_of_a_look_ahead_adder() -> None:
    """64 bits on 10^5 random inputs in under a second, and every sum right."""
    built = build("add-lookahead", Signature("add", (64, 64), carry=True))
    rng = np.random.default_rng(64)
    words = np.zeros((built.coarse.width, INPUTS // 64), dtype=np.uint64)
    words[:129] = rng.integers(0, 2**64, size=(129, INPUTS // 64), dtype=np.uint64)
    start = time.perf_counter()
    after = replay(built.coarse.ops, words)
    seconds = time.perf_counter() - start
    assert seconds < 1
    carry = np.zeros(INPUTS // 64, dtype=np.uint64)
    for at in range(64):
        a, b = words[at], words[64 + at]
        assert (after[64 + at] == (a ^ b ^ carry)).all()
        carry = (a & b) | (a & carry) | (b & carry)
    assert (after[128] == (words[128] ^ carry)).all()
    assert (after[:64] == words[:64]).all()
    assert not after[129:].any()


@pytest.mark.bench
def test_build_of_large_recipes() -> None:
    """Recipes of 64 bits are written out in under a second each."""
    calls = [
        ("add-lookahead", Signature("add", (64, 64), carry=True)),
        ("constant-borrowed", Signature("add_constant", (64,), constant=2**64 - 1)),
        ("lookup-unary", Signature("lookup", (10, 8), table=tuple([255] * 1024))),
    ]
    for name, signature in calls:
        build.cache_clear()
        start = time.perf_counter()
        build(name, signature)
        assert time.perf_counter() - start < 1, name
