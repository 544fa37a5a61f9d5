"""A report: one self-contained file that a colleague can read without the tool."""

from __future__ import annotations

from kingpost.core.export.report.material import Material


def report_text(material: Material, form: str) -> str:
    """The report as ``html`` or ``markdown``."""
    from kingpost.core.export.report.sections import document

    if form == "html":
        from kingpost.core.export.report.html import html

        return html(document(material))
    from kingpost.core.export.report.markdown import markdown

    return markdown(document(material))
