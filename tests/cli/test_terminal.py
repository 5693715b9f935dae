"""What is told along the way: on a terminal only, and never where it was not wanted."""

from __future__ import annotations

import io

import pytest

from relook.cli.terminal import Terminal


class _Screen(io.StringIO):
    """A stream that says that it is a terminal."""

    def isatty(self):
        return True


@pytest.fixture(autouse=True)
def _terminal(monkeypatch):
    monkeypatch.setenv("TERM", "xterm-256color")
    monkeypatch.delenv("NO_COLOR", raising=False)


@pytest.mark.parametrize(
    ("stderr", "quiet", "told"),
    [(_Screen, False, True), (_Screen, True, False), (io.StringIO, False, False)],
)
def test_work_says_what_it_does_where_somebody_looks(stderr, quiet, told):
    """On a terminal the words appear on stderr; with --quiet or in a file they do not."""
    out, err = io.StringIO(), stderr()
    with Terminal(out, err, quiet=quiet).doing() as doing:
        doing("ranking items [b]one[/b]")
    assert ("ranking items [b]one[/b]" in err.getvalue()) == told
    assert out.getvalue() == ""


def test_what_is_told_is_gone_at_the_end():
    """The line is taken away, so that the next one stands where it stood."""
    err = _Screen()
    with Terminal(io.StringIO(), err).doing() as doing:
        doing("ranking items")
    assert err.getvalue().rstrip().endswith(("\x1b[2K", "\x1b[?25h"))
