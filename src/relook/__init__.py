"""relook: find the items worth a second look when coders disagree, and see the job through.

General layout, each layer importing only what stands to its right:

    cli → (frames, engines) → project → (tables, worksheet) → cells → core → errors

core       the arithmetic: agreement, contributions, ranking; numpy only
tables     label, item and code-book tables in; result tables out
worksheet  the spreadsheets: written, and read back as people return them
cells      spreadsheet files as typed cells, and text made safe for a cell
project    a folder's settings, rounds and record of decisions, and what is done with them
frames     the Python interface, which the names below make up: DataFrames in and out
engines    labels in parts, on several processes or machines
cli        commands; the only place that prints and exits
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from relook.errors import RelookError

if TYPE_CHECKING:
    from relook.frames.measured import Measured, measure
    from relook.frames.queued import Queue, queue
    from relook.frames.returned import Rescored, Returned, collect, rescore

__version__ = "0.1.0"
__all__ = [
    "Measured",
    "Queue",
    "RelookError",
    "Rescored",
    "Returned",
    "__version__",
    "collect",
    "measure",
    "queue",
    "rescore",
]

#: Where each name comes from; imported when it is asked for, so that `import relook` stays light.
_FROM = {
    "Measured": "measured",
    "measure": "measured",
    "Queue": "queued",
    "queue": "queued",
    "Rescored": "returned",
    "Returned": "returned",
    "collect": "returned",
    "rescore": "returned",
}


def __getattr__(name: str) -> object:
    if name not in _FROM:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from importlib import import_module

    return getattr(import_module(f"relook.frames.{_FROM[name]}"), name)


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
