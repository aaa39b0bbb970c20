"""The examples in the docstrings run."""

import doctest
from types import ModuleType

import pytest

from placer import yamltext
from placer.device import fidelity, read


@pytest.mark.parametrize("module", [yamltext, fidelity, read])
def test_examples_run(module: ModuleType) -> None:
    outcome = doctest.testmod(module)
    assert outcome.attempted > 0
    assert outcome.failed == 0
