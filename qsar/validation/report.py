"""The validation report: one HTML file that carries its figures, the figures as PNG, and the numbers as CSV."""

from __future__ import annotations

import base64
import csv
import html
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from qsar.errors import UserError
from qsar.files import atomic_path

_STYLE = (
    "body{font:16px/1.5 system-ui,sans-serif;max-width:56rem;margin:2rem auto;padding:0 1rem;color:#1a1a1a;"
    "background:#fff}table{border-collapse:collapse;margin:1rem 0;font-variant-numeric:tabular-nums}"
    "td,th{padding:.25rem .7rem;border-bottom:1px solid #bbb;text-align:right}td:first-child,th:first-child"
    "{text-align:left}img{max-width:100%;height:auto}h2{margin-top:2.2rem}code{font-size:.92em}"
    "figure{margin:1rem 0}figcaption{color:#444}"
)


@dataclass(frozen=True)
class Table:
    """Numbers under headings; the first column names the row."""

    headings: tuple[str, ...]
    rows: Sequence[Sequence[str | int | float]]


@dataclass(frozen=True)
class Picture:
    """A figure: name of its file without extension, PNG data, and what it shows."""

    name: str
    png: bytes
    caption: str


@dataclass(frozen=True)
class Section:
    """One question with its answer."""

    title: str
    text: str
    tables: tuple[Table, ...] = ()
    pictures: tuple[Picture, ...] = ()


def shown(value: str | int | float) -> str:
    """A cell for people: three decimals for fractions."""
    if isinstance(value, float):
        return "–" if value != value else f"{value:.3f}"
    return str(value)


def as_html(title: str, opening: str, sections: Sequence[Section]) -> str:
    """The report as one page that needs no other file."""
    parts = [
        '<!DOCTYPE html><html lang="en"><head><meta charset="utf-8">',
        '<meta name="viewport" content="width=device-width, initial-scale=1">',
        f"<title>{html.escape(title)}</title><style>{_STYLE}</style></head><body>",
        f"<h1>{html.escape(title)}</h1><p>{html.escape(opening)}</p>",
    ]
    for section in sections:
        parts.append(f"<h2>{html.escape(section.title)}</h2><p>{html.escape(section.text)}</p>")
        parts += [_table(table) for table in section.tables]
        for picture in section.pictures:
            data = base64.b64encode(picture.png).decode("ascii")
            caption = html.escape(picture.caption)
            parts.append(
                f'<figure><img alt="{caption}" src="data:image/png;base64,{data}">'
                f"<figcaption>{caption}</figcaption></figure>"
            )
    return "".join([*parts, "</body></html>\n"])


def _table(table: Table) -> str:
    head = "".join(f"<th>{html.escape(h)}</th>" for h in table.headings)
    body = "".join(
        "<tr>" + "".join(f"<td>{html.escape(shown(cell))}</td>" for cell in row) + "</tr>" for row in table.rows
    )
    return f"<table><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"


def write(folder: Path, stem: str, title: str, opening: str, sections: Sequence[Section]) -> list[Path]:
    """Write ``<stem>.html``, ``<stem>.csv`` and the figures.

    Parameters
    ----------
    folder : pathlib.Path
        Made if it is not there.
    stem : str
        Name of the files; figures are ``<stem>-<figure>.png``.
    title, opening : str
    sections : sequence of Section

    Returns
    -------
    list of pathlib.Path
        What was written, the page first.

    Raises
    ------
    UserError
        If the folder cannot be written.
    """
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise UserError(f"cannot create {folder}: {error.strerror}") from error
    page, numbers = folder / f"{stem}.html", folder / f"{stem}.csv"
    with atomic_path(page) as path:
        path.write_text(as_html(title, opening, sections), encoding="utf-8")
    with atomic_path(numbers) as path, path.open("w", encoding="utf-8", newline="") as handle:
        writer = csv.writer(handle)
        writer.writerow(["section", "row", "column", "value"])
        for section in sections:
            for table in section.tables:
                for row in table.rows:
                    for heading, cell in zip(table.headings[1:], row[1:], strict=True):
                        writer.writerow([section.title, row[0], heading, _number(cell)])
    written = [page, numbers]
    for section in sections:
        for picture in section.pictures:
            target = folder / f"{stem}-{picture.name}.png"
            with atomic_path(target) as path:
                path.write_bytes(picture.png)
            written.append(target)
    return written


def _number(cell: str | int | float) -> str:
    return f"{cell:.6g}" if isinstance(cell, float) else str(cell)
