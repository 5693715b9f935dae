"""Small .ods files written part by part, so that odd ones can be written too."""

from __future__ import annotations

import io
import zipfile

MIMETYPE = "application/vnd.oasis.opendocument.spreadsheet"
_NS = "urn:oasis:names:tc:opendocument:xmlns"
SPACES = (
    f'xmlns:office="{_NS}:office:1.0" xmlns:table="{_NS}:table:1.0" xmlns:text="{_NS}:text:1.0" '
    f'xmlns:style="{_NS}:style:1.0" xmlns:meta="{_NS}:meta:1.0" '
    'xmlns:calcext="urn:org:documentfoundation:names:experimental:calc:xmlns:calcext:1.0"'
)


def ods(rows: str, *, mimetype: str = MIMETYPE, meta: str = "", manifest: str = "") -> bytes:
    """Return an .ods file whose one sheet, "Queue", holds the given table:table-row elements."""
    content = (
        f'<?xml version="1.0"?><office:document-content {SPACES}><office:body><office:spreadsheet>'
        f'<table:table table:name="Queue">{rows}</table:table>'
        "</office:spreadsheet></office:body></office:document-content>"
    )
    parts = {"mimetype": mimetype, "content.xml": content}
    if meta:
        parts["meta.xml"] = f"<office:document-meta {SPACES}>{meta}</office:document-meta>"
    if manifest:
        parts["META-INF/manifest.xml"] = manifest
    return zipped(parts)


def zipped(parts: dict[str, str | bytes]) -> bytes:
    """Return a zip file of the given parts."""
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as target:
        for name, part in parts.items():
            target.writestr(name, part)
    return out.getvalue()


def row(*cells: str, attributes: str = "") -> str:
    """Return a table:table-row element."""
    return f"<table:table-row {attributes}>{''.join(cells)}</table:table-row>"


def text(value: str, attributes: str = "") -> str:
    """Return a text cell."""
    return (
        f'<table:table-cell office:value-type="string" {attributes}>'
        f"<text:p>{value}</text:p></table:table-cell>"
    )
