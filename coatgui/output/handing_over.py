"""The summary and its figures as files."""

from __future__ import annotations

import re
from collections.abc import Mapping
from pathlib import Path

from coatgui.output.document import Figure
from coatgui.output.figures import all_figures
from coatgui.output.html_form import html_document
from coatgui.output.summary import Identification, inspection_summary
from coatgui.output.whole import write_whole
from coatgui.records import Assessment, Campaign

# Names that some systems keep for devices, and characters that none takes in a file's name.
_RESERVED = re.compile(r"(?i)^(con|prn|aux|nul|com\d|lpt\d)$")


def write_summary(
    assessment: Assessment,
    campaign: Campaign,
    path: Path,
    identification: Identification | None = None,
    photographs: Mapping[str, bytes] | None = None,
) -> None:
    """Write the inspection summary whole or not at all: as PDF where the name ends in .pdf, else as
    one HTML file. `photographs` are bytes by their SHA-256. Raises OSError, and PagesUnavailable
    where a PDF needs Qt and it is not there."""
    document = inspection_summary(assessment, campaign, identification, photographs)
    if path.suffix.lower() == ".pdf":
        from coatgui.output.pages import write_pdf

        write_pdf(document, path)
        return
    text = html_document(document)
    write_whole(path, lambda file: file.write(text.encode("utf-8")))


def write_figures(
    assessment: Assessment, campaign: Campaign, folder: Path, kind: str = "svg"
) -> list[Path]:
    """Write every figure into `folder`, made if need be; `kind` is svg, pdf or png. Each file is
    written whole or not at all. Raises OSError and PagesUnavailable."""
    folder.mkdir(exist_ok=True)
    written: list[Path] = []
    for figure in all_figures(assessment, campaign):
        path = folder / f"{_file_name(figure.name, [p.stem for p in written])}.{kind}"
        content = _figure(figure, kind)
        write_whole(path, lambda file, content=content: file.write(content))  # type: ignore[misc]
        written.append(path)
    return written


def _figure(figure: Figure, kind: str) -> bytes:
    if kind == "svg":
        text = figure.drawing.svg(figure.caption, figure.alternative)
        return f'<?xml version="1.0" encoding="UTF-8"?>\n{text}\n'.encode()
    from coatgui.output.pages import figure_pdf, figure_png

    return figure_pdf(figure) if kind == "pdf" else figure_png(figure)


def _file_name(name: str, taken: list[str]) -> str:
    """A name that every file system takes, and no other figure has."""
    plain = re.sub(r"[^\w.+-]", "_", name).strip(".")[:60] or "figure"
    if _RESERVED.match(plain):
        plain = f"_{plain}"
    lower = {known.lower() for known in taken}
    found, number = plain, 1
    while found.lower() in lower:
        number += 1
        found = f"{plain}_{number}"
    return found
