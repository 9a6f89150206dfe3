"""Text from a file, made safe to print: no control characters, no terminal escapes."""

from __future__ import annotations

import unicodedata


def safe(text: str, longest: int = 200) -> str:
    r"""
    Return text that cannot move a cursor, change a colour or turn the reading direction.

    Examples
    --------
    >>> safe("Harrow \x1b[31mSkerry\n")
    'Harrow ?[31mSkerry?'
    """
    shown = "".join(
        "?" if unicodedata.category(character) in ("Cc", "Cf", "Cs", "Zl", "Zp") else character
        for character in text[: longest + 1]
    )
    return shown if len(shown) <= longest else shown[: longest - 3] + "..."
