"""Pictures of modes: pole map and mode shapes, written whole or not at all. Matplotlib loads only when one is drawn."""

from __future__ import annotations

import os
import warnings
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from mdof.errors import OutputError, UsageError

if TYPE_CHECKING:
    from mdof.description.schema import Model
    from mdof.modes.mode import DampedModes

__all__ = ["check_figure", "draw_modes"]

_KINDS = (".svg", ".png", ".pdf")
#: Mode shapes on one page; a picture of one page shows the lowest so many.
_PANELS = 8


def check_figure(path: str | os.PathLike[str], *, several: bool = False) -> None:
    """Make sure, before anything is computed, that a figure can be written.

    Parameters
    ----------
    several : more than one model or state will be drawn, which takes pages.

    Raises
    ------
    UsageError
        If the name has no known ending, or one picture cannot hold what is asked for.
    OutputError
        If the folder does not exist or cannot be written.
    """
    target = Path(path)
    kind = target.suffix.lower()
    if kind not in _KINDS:
        raise UsageError(f"{target}: a figure is a .svg, .png or .pdf file; end its name in one of these")
    if several and kind != ".pdf":
        raise UsageError(
            f"{target}: one picture holds one model and state; end the name in .pdf for pages, or draw them singly"
        )
    if target.is_dir():
        raise OutputError(f"{target}: cannot be written: it is a folder")
    folder = target.parent
    if not folder.is_dir():
        raise OutputError(f"{target}: cannot be written: there is no folder {folder}")
    probe = folder / f".mdof-probe-{os.getpid()}"
    try:
        os.close(os.open(probe, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o600))
        os.unlink(probe)
    except OSError as error:
        raise OutputError(f"{target}: cannot be written: {error.strerror or error}") from error


def draw_modes(path: str | os.PathLike[str], solved: Sequence[tuple[Model, DampedModes]]) -> None:
    """Draw the pole map and mode shapes of solved models into one file.

    A ``.pdf`` holds a page with the pole map and the lowest shapes for every model, then pages with all other shapes;
    a ``.svg`` or ``.png`` holds the first page. An existing file is replaced only by a whole new one.

    Raises
    ------
    UsageError, OutputError
        As :func:`check_figure`, or if writing fails.
    """
    check_figure(path, several=len(solved) > 1)
    import matplotlib

    from mdof.report.pages import STYLE, first_page, shape_page

    target = Path(path)
    kind = target.suffix.lower().removeprefix(".")
    temporary = target.with_name(f".mdof-{os.getpid()}-{target.name}")
    try:
        # Names may hold letters that no font at hand has; the boxes drawn for them are plain enough.
        with matplotlib.rc_context(STYLE), warnings.catch_warnings():
            warnings.filterwarnings("ignore", message="Glyph .* missing from")
            if kind == "pdf":
                from matplotlib.backends.backend_pdf import PdfPages

                with PdfPages(temporary, metadata={"Creator": "mdof"}) as pages:
                    for model, modes in solved:
                        pages.savefig(first_page(model, modes, _PANELS, rest=True))
                        for start in range(_PANELS, len(modes), 2 * _PANELS):
                            pages.savefig(shape_page(model, modes, range(start, min(start + 2 * _PANELS, len(modes)))))
            else:
                model, modes = solved[0]
                figure = first_page(model, modes, _PANELS, rest=False)
                _save(figure, temporary, kind)
        os.replace(temporary, target)
    except OSError as error:
        raise OutputError(f"{target}: cannot be written: {error.strerror or error}") from error
    finally:
        temporary.unlink(missing_ok=True)


def _save(figure: Any, path: Path, kind: str) -> None:
    # No date in the file: the same modes give the same picture.
    figure.savefig(path, format=kind, dpi=150, metadata={"Date": None} if kind == "svg" else None)
