"""``mdof manual``: the manual, offline."""

from __future__ import annotations

from pathlib import Path

import click

from mdof.cli.app import nearest
from mdof.cli.session import Session


def _pages() -> dict[str, Path]:
    folder = Path(__file__).parent.parent / "manual"
    return {path.stem: path for path in sorted(folder.glob("*.md"))}


@click.command(short_help="The manual, page by page.")
@click.argument("topic", required=False)
@click.pass_context
def manual(ctx: click.Context, topic: str | None) -> None:
    """Print the page about TOPIC; without TOPIC, the list of pages."""
    session: Session = ctx.obj
    pages = _pages()
    if topic is None:
        room = max(map(len, pages), default=0)
        lines = [f"{name:<{room}}  {_title(path)}" for name, path in pages.items()]
        session.data(
            "\n".join([*lines, "", "`mdof manual TOPIC` prints a page; `mdof COMMAND --help` its options.", ""])
        )
        return
    if topic not in pages:
        begun = [name for name in pages if name.startswith(topic)]
        topic = begun[0] if len(begun) == 1 else topic
    if topic not in pages:
        raise click.UsageError(f"there is no page about {topic!r}{nearest(topic, list(pages))}", ctx)
    from mdof.report.prose import page_text

    session.data(page_text(pages[topic].read_text(encoding="utf-8"), session.look()))


def _title(path: Path) -> str:
    with path.open(encoding="utf-8") as stream:
        return stream.readline().removeprefix("#").strip()
