"""Accepted names of columns and metadata (spellings.toml), and how a name is looked up."""

from __future__ import annotations

import re
import unicodedata
from functools import lru_cache
from importlib import resources
from typing import Any


class Spellings:
    """The data of spellings.toml, made ready for looking up."""

    def __init__(self) -> None:
        import tomllib

        text = resources.files("backveer.io.readers").joinpath("spellings.toml").read_text("utf-8")
        data = tomllib.loads(text)
        words: dict[str, list[str]] = data["words"]
        self.ignored = frozenset(words["ignored"])
        self.deviation = frozenset(words["deviation"])
        self.other = frozenset(words["other"])
        self.height = frozenset(words["height"])
        self.needs_unit = frozenset(words["needs_unit"])
        self.implied: dict[str, tuple[str, str]] = {
            key: (quantity, unit) for key, (quantity, unit) in data["implied"].items()
        }
        self.columns = self._table(data["columns"])
        self.metadata = self._table(data["metadata"])
        self.language: dict[str, set[str]] = {}
        for part in ("columns", "metadata"):
            for spelled in data[part].values():
                for language, phrases in spelled.items():
                    for phrase in phrases:
                        if language != "signs":
                            self.language.setdefault("".join(words_of(phrase)), set()).add(language)

    def _table(self, part: dict[str, dict[str, list[str]]]) -> dict[Any, tuple[str, ...]]:
        table: dict[Any, tuple[str, ...]] = {}
        for quantity, spelled in part.items():
            for phrases in spelled.values():
                for phrase in phrases:
                    for key in self.keys(words_of(phrase)):
                        if quantity not in table.get(key, ()):
                            table[key] = (*table.get(key, ()), quantity)
        return table

    def keys(self, words: tuple[str, ...]) -> tuple[Any, ...]:
        """Ways to look words up: written together, in any order, without the little words."""
        kept = tuple(word for word in words if word not in self.ignored) or words
        return ("".join(words), "".join(kept), frozenset(kept))

    def find(self, table: dict[Any, tuple[str, ...]], words: tuple[str, ...]) -> tuple[str, ...]:
        """Return what the words can name, nothing where they are not known."""
        for key in self.keys(words):
            if key in table:
                return table[key]
        return ()


@lru_cache(maxsize=1)
def spellings() -> Spellings:
    """Return the accepted names, read once."""
    return Spellings()


def words_of(name: str) -> tuple[str, ...]:
    """
    Words of a name: without case, accents and punctuation, digits apart from letters.

    Examples
    --------
    >>> words_of("Windgeschw. in 40m"), words_of("Höhe_über NN"), words_of("WS40")
    (('windgeschw', 'in', '40', 'm'), ('hohe', 'uber', 'nn'), ('ws', '40'))
    """
    text = unicodedata.normalize("NFKD", name.casefold())
    text = "".join(c for c in text if not unicodedata.combining(c)).replace("œ", "oe")
    return tuple(re.findall(r"[^\W\d_]+|\d+(?:[.,]\d+)?", text))


def metadata_key(key: str) -> str | None:
    """
    Return what a metadata key names, None where that is not known.

    Examples
    --------
    >>> metadata_key("Stationshöhe"), metadata_key("Latitude (deg)"), metadata_key("Pilot")
    ('elevation', 'latitude', None)
    """
    known = spellings()
    bare = re.sub(r"[\[({][^\])}]*[\])}]", " ", key)
    for text in (key, bare, *(bare[: cut.start()] for cut in reversed(cuts(bare)))):
        found = known.find(known.metadata, words_of(text)) if text.strip() else ()
        if found:
            return found[0]
    return None


def languages(names: tuple[str, ...]) -> frozenset[str]:
    """
    Return the languages that the names give away: those that share no word with another.

    Examples
    --------
    >>> sorted(languages(("Longitude", "Pression (hPa)"))), sorted(languages(("Longitude",)))
    (['fr'], [])
    """
    known = spellings()
    found: set[str] = set()
    for name in names:
        bare = re.sub(r"[\[({][^\])}]*[\])}]", " ", name)
        spoken = known.language.get("".join(words_of(bare)), set())
        if len(spoken) == 1:
            found |= spoken
    return frozenset(found - {"en"}) or frozenset(found)


def cuts(text: str) -> list[re.Match[str]]:
    """Places where a unit may begin, the longest unit first."""
    cuts = list(re.finditer(r"[\s_,;/.:|-]+(?=[^\s_,;/.:|-])|(?<=\d)(?=[^\W\d_])", text))
    return [cut for cut in cuts if cut.start() > 0]
