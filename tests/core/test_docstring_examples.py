"""The examples in the docstrings of the core are true."""

import doctest

import pytest

from relook.core import differences, sample_size


@pytest.mark.parametrize("module", [differences, sample_size])
def test_examples_are_true(module):
    """Each example runs and gives what it says, and there is one at least."""
    found = doctest.testmod(module)
    assert found.attempted > 0
    assert found.failed == 0
