"""Plain text as LaTeX: special characters, accents and dashes, in ASCII alone."""

from __future__ import annotations

import unicodedata

__all__ = ["latex_text"]

_SPECIAL = {
    **{c: f"\\{c}" for c in "#$%&_{}"},
    "\\": r"\textbackslash{}",
    "~": r"\textasciitilde{}",
    "^": r"\textasciicircum{}",
    **{"<": "$<$", ">": "$>$", "|": "$|$", '"': "''"},
    **{
        "–": "--",
        "—": "---",
        "‐": "-",
        "‑": "-",
        "−": "$-$",
        "…": r"\ldots{}",
        "·": r"$\cdot$",
        "×": r"$\times$",
    },
    **{"‘": "`", "’": "'", "“": "``", "”": "''", "«": "<<", "»": ">>", "\u00a0": "~", "§": r"\S{}"},
    **{"ß": r"{\ss}", "ø": r"{\o}", "Ø": r"{\O}", "æ": r"{\ae}", "Æ": r"{\AE}", "œ": r"{\oe}", "Œ": r"{\OE}"},
    **{"ł": r"{\l}", "Ł": r"{\L}", "ı": r"{\i}", "å": r"{\aa}", "Å": r"{\AA}"},
    **{"√": r"$\surd$", "≤": r"$\le$", "≥": r"$\ge$", "≈": r"$\approx$", "±": r"$\pm$", "∞": r"$\infty$"},
    **{
        "∫": r"$\int$",
        "Σ": r"$\Sigma$",
        "∑": r"$\sum$",
        "→": r"$\to$",
        "°": r"$^\circ$",
        "⁄": "/",
        "∈": r"$\in$",
    },
}
_GREEK = {c: rf"$\{unicodedata.name(c).rsplit(' ', 1)[1].lower()}$" for c in "αβγδεζηθικμνξπρστυφχψω"} | {
    "λ": r"$\lambda$",
    "Δ": r"$\Delta$",
    "Θ": r"$\Theta$",
    "Φ": r"$\Phi$",
    "Ω": r"$\Omega$",
}
_ACCENTS = {
    **{"\u0300": "`", "\u0301": "'", "\u0302": "^", "\u0303": "~", "\u0304": "=", "\u0306": "u"},
    **{
        "\u0307": ".",
        "\u0308": '"',
        "\u030a": "r",
        "\u030b": "H",
        "\u030c": "v",
        "\u0327": "c",
        "\u0328": "k",
    },
}


def latex_text(text: str) -> str:
    r"""Return a text as LaTeX sets it, in ASCII; a character that LaTeX lacks is shown by its code point.

    >>> print(latex_text("Nørsett & Prothero–Kværnø, 5 %, Hairer’s Möbius"))
    N{\o}rsett \& Prothero--Kv{\ae}rn{\o}, 5 \%, Hairer's M{\"o}bius
    """
    return "".join(map(_character, unicodedata.normalize("NFC", " ".join(text.split()))))


def _character(c: str) -> str:
    if c in _SPECIAL:
        return _SPECIAL[c]
    if c.isascii():
        return c if c.isprintable() else " "
    if c in _GREEK:
        return _GREEK[c]
    base, *marks = list(unicodedata.normalize("NFD", c))
    if len(marks) == 1 and marks[0] in _ACCENTS and base.isascii() and base.isalpha():
        base = rf"\{base} " if base in "ij" and marks[0] not in "\u0327\u0328" else base
        accent = _ACCENTS[marks[0]]
        return "{\\" + accent + (" " if accent.isalpha() else "") + base.rstrip() + "}"
    plain = unicodedata.normalize("NFKC", c)
    return plain if plain.isascii() and plain.isprintable() else f"[U+{ord(c):04X}]"
