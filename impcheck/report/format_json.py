"""The JSON result file. In: a document; out: its text, format 1."""

from __future__ import annotations

from impcheck.report.document import Document

SUFFIX = ".json"


def render(document: Document) -> str:
    """The document as JSON text."""
    return document.to_json()
