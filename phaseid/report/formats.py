"""The report as HTML, Markdown and DOCX."""

from __future__ import annotations

import base64
import io
from collections.abc import Callable, Mapping

import phaseid
from phaseid.errors import InputError
from phaseid.report.content import Report, Table


def to_html(report: Report) -> bytes:
    """One self-contained HTML page; every text is escaped."""
    import jinja2

    environment = jinja2.Environment(
        loader=jinja2.PackageLoader("phaseid.report", "templates"), autoescape=True
    )
    environment.filters["base64"] = lambda data: base64.b64encode(data).decode("ascii")
    page = environment.get_template("report.html").render(
        report=report, version=phaseid.__version__
    )
    return page.encode("utf-8")


def to_markdown(report: Report) -> bytes:
    """Markdown with pipe tables; pictures are left out, they are files of their own."""
    lines = [f"# {_plain(report.title)}", ""]
    for section in report.sections:
        lines += [f"## {_plain(section.title)}", ""]
        for text in section.paragraphs:
            lines += [_plain(text), ""]
        if section.table is not None:
            lines += [*_pipes(section.table), ""]
    if report.sources:
        lines += ["## Sources to cite", "", *(f"- {_plain(s)}" for s in report.sources), ""]
    return "\n".join(lines).encode("utf-8")


def to_docx(report: Report) -> bytes:
    """A DOCX document.

    Raises
    ------
    InputError
        If python-docx is not installed.
    """
    try:
        import docx
        from docx.shared import Cm
    except ImportError:
        raise InputError(
            "Writing DOCX needs python-docx; install it with: pip install 'phaseid[docx]'."
        ) from None
    written = docx.Document()
    written.add_heading(report.title, level=0)
    for section in report.sections:
        written.add_heading(section.title, level=1)
        for text in section.paragraphs:
            written.add_paragraph(text)
        if section.picture is not None:
            written.add_picture(io.BytesIO(section.picture), width=Cm(16))
        if section.table is not None:
            _word_table(written, section.table)
    if report.sources:
        written.add_heading("Sources to cite", level=1)
        for source in report.sources:
            written.add_paragraph(source, style="List Bullet")
    stream = io.BytesIO()
    written.save(stream)
    return stream.getvalue()


FORMATS: Mapping[str, Callable[[Report], bytes]] = {
    ".html": to_html,
    ".md": to_markdown,
    ".docx": to_docx,
}


def _word_table(written, table: Table) -> None:  # type: ignore[no-untyped-def]
    made = written.add_table(rows=1, cols=len(table.heading), style="Light List")
    for cell, text in zip(made.rows[0].cells, table.heading, strict=True):
        cell.text = text
    for row in table.rows:
        for cell, text in zip(made.add_row().cells, row, strict=True):
            cell.text = text


def _pipes(table: Table) -> list[str]:
    lines = ["| " + " | ".join(_plain(c) for c in table.heading) + " |"]
    lines.append("|" + " --- |" * len(table.heading))
    lines += ["| " + " | ".join(_plain(c) for c in row) + " |" for row in table.rows]
    return lines


def _plain(text: str) -> str:
    """Keep text from being taken for markup."""
    for mark in "\\`*_{}[]<>|":
        text = text.replace(mark, f"\\{mark}")
    return " ".join(text.split())
