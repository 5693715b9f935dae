"""relook: find the items worth a second look when coders disagree, and see the job through.

General layout, each layer importing only what stands to its right:

    cli → project → (tables, worksheet) → cells → core → errors

core       the arithmetic: agreement, contributions, ranking; numpy only
tables     label, item and code-book tables in; result tables out
worksheet  the spreadsheets: written, and read back as people return them
cells      spreadsheet files as typed cells, and text made safe for a cell
project    a folder's settings, rounds and record of decisions, and what is done with them
cli        commands; the only place that prints, exits and asks the clock
"""

__version__ = "0.1.0"
__all__ = ["__version__"]
