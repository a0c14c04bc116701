"""The guides: Markdown as package data, shown by `newel guide`."""

from __future__ import annotations

import sys
from importlib.resources import files
from types import ModuleType

__all__ = ["guide", "topics"]


def guide(topic: str | None = None) -> str:
    """Return a guide as Markdown.

    Args:
        topic: one of `topics()`; the list of them where it is left out.

    Raises:
        UnknownName: there is no such guide; the text names those that there are.

    Example:
        >>> guide("march-a-model").splitlines()[0]
        '# March a model'
    """
    known = topics()
    if topic is None:
        lines = [f"- `newel guide {name}`: {title}" for name, title in known.items()]
        return "\n".join(["# Guides", "", *lines, ""])
    if topic not in known:
        from newel.catalogue.suggestions import unknown_name

        raise unknown_name("guide", topic, known)
    return _text(topic)


def topics() -> dict[str, str]:
    """Return the title of each guide by its topic, in alphabetical order.

    Example:
        >>> topics()["march-a-model"]
        'March a model'
    """
    found = sorted(
        file.name.removesuffix(".md") for file in files(__name__).iterdir() if _is_guide(file.name)
    )
    return {name: _text(name).partition("\n")[0].lstrip("# ") for name in found}


def _is_guide(name: str) -> bool:
    return name.endswith(".md") and not name.startswith(".")


def _text(topic: str) -> str:
    return files(__name__).joinpath(f"{topic}.md").read_text(encoding="utf-8")


class _Guides(ModuleType):
    """Makes `newel.guide(topic)` work although the folder of the guides has the same name.

    Python binds the name `guide` in `newel` to this module when it is imported, whoever imports it.
    """

    def __call__(self, topic: str | None = None) -> str:
        return guide(topic)


sys.modules[__name__].__class__ = _Guides
