"""Small tableau files for the tests of this folder: true methods, and one whose claim is false."""

from pathlib import Path

from newel.methods.tableau import Tableau


def text(slug: str, node: str = "1/2", order: int = 2, name: str = "Tiny", also: str = "") -> str:
    """Return the file of the two-stage method of order 2 with this node: the weights 1 − 1/(2c), 1/(2c)."""
    weights = {"1/2": '"0", "1"', "2/3": '"1/4", "3/4"', "1": '"1/2", "1/2"', "3/4": '"1/3", "2/3"'}[node]
    return (
        f'schema = "newel-tableau/1"\nslug = "{slug}"\nname = "{name}"\nalso_called = [{also}]\n'
        f'source = "derived for these tests"\nnumbers = "derived"\norder = {order}\nnodes = ["0", "{node}"]\n'
        f'matrix = [[], ["{node}"]]\nweights = [{weights}]\n'
    )


def write(folder: Path, slug: str, **facts: object) -> Path:
    """Write such a file and return its path."""
    folder.mkdir(parents=True, exist_ok=True)
    file = folder / f"{slug}.toml"
    file.write_text(text(slug, **facts), encoding="utf-8")  # type: ignore[arg-type]  # facts are those of text
    return file


def two_stages(slug: str, order: int = 2) -> Tableau:
    """Return a tableau made in Python, with a node that no built-in method has; it is of order 2."""
    return Tableau(slug, order=order, matrix=[[], ["3/7"]], weights=["-1/6", "7/6"])
