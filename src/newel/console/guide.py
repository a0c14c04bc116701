"""`newel guide`: how things are done, in Markdown."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace

from newel.console.screen import Screen

__all__ = ["PASTE", "WHAT", "add", "run"]

WHAT = "Show a guide, or which guides there are."
PASTE = ("newel guide", "newel guide march-a-model")


def add(parser: ArgumentParser) -> None:
    """Add the topic."""
    parser.add_argument(
        "topic", nargs="?", metavar="TOPIC", help="which guide; the list where it is left out"
    )


def run(options: Namespace, screen: Screen) -> int:
    """Show a guide, drawn on a terminal and as it is elsewhere."""
    from newel.guide import guide, topics

    text = guide(options.topic)
    if options.json and options.topic is None:
        found = [{"topic": topic, "title": title} for topic, title in topics().items()]
        screen.document("newel-guides/1", {"topics": found})
    elif options.json:
        title = topics()[options.topic]
        screen.document("newel-guide/1", {"topic": options.topic, "title": title, "text": text})
    elif screen.console.is_terminal:
        from rich.markdown import Markdown

        screen.draw(Markdown(text))
    else:
        screen.write(text)
    return 0
