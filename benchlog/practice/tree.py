"""The tree of headers that an instrument knows, with optional nodes and both forms of a keyword.

A pattern is written as manuals write it: ``[SOURce]:FREQuency[:CW|:FIXed]``.  Capitals are the
short form, the whole word is the long form, brackets may be left out, and nothing between the two
forms is accepted (SCPI-99, volume 1, 6.2).
"""

import re
from collections.abc import Iterable
from dataclasses import dataclass, field
from itertools import product
from typing import Generic, TypeVar

from benchlog.practice.error_table import ScpiError

_PART = re.compile(r"\[([^\]]+)\]|:?(\*?[A-Za-z]+)")
_SUFFIXED = re.compile(r"(\*?[A-Z_][A-Z0-9_]*?)(\d*)")

T = TypeVar("T")


def short_form(keyword: str) -> str:
    """Return the short form of a keyword: ``FREQuency`` gives ``FREQ``."""
    return "".join(letter for letter in keyword if not letter.islower())


def spellings(keyword: str) -> tuple[str, str]:
    """Return the only two spellings of a keyword, in capitals."""
    return short_form(keyword), keyword.upper()


def expand(pattern: str) -> list[tuple[str, ...]]:
    """Return every sequence of keywords that a pattern allows."""
    parts: list[list[str]] = []
    for optional, fixed in _PART.findall(pattern):
        keywords = [word.strip(":") for word in (optional or fixed).split("|")]
        parts.append(["", *keywords] if optional else keywords)
    return [tuple(word for word in chosen if word) for chosen in product(*parts)]


@dataclass(slots=True)
class _Node(Generic[T]):
    children: "dict[str, _Node[T]]" = field(default_factory=dict)
    command: T | None = None
    query: T | None = None


class HeaderTree(Generic[T]):
    """Finds what belongs to a header.

    Args:
        entries: Pattern (with a question mark for a query) and what it stands for.
    """

    __slots__ = ("_root",)

    def __init__(self, entries: Iterable[tuple[str, T]]) -> None:
        self._root: _Node[T] = _Node()
        for pattern, entry in entries:
            for keywords in expand(pattern.rstrip("?")):
                self._insert(keywords, entry, query=pattern.endswith("?"))

    def _insert(self, keywords: tuple[str, ...], entry: T, *, query: bool) -> None:
        node = self._root
        for keyword in keywords:
            short, long = spellings(keyword)
            child = node.children.get(long) or _Node()
            node.children[short] = node.children[long] = child
            node = child
        if query:
            node.query = entry
        else:
            node.command = entry

    def find(self, mnemonics: tuple[str, ...], *, query: bool) -> T:
        """Return what a header stands for.

        Args:
            mnemonics: Words in capitals from the root.
            query: Whether the header ended with a question mark.

        Raises:
            ScpiError: Undefined header (-113), or a numeric suffix other than 1 (-114).
        """
        node = self._root
        for mnemonic in mnemonics:
            node = _child(node, mnemonic)
        found = node.query if query else node.command
        if found is None:
            raise ScpiError(-113)
        return found


def _child(node: _Node[T], mnemonic: str) -> _Node[T]:
    match = _SUFFIXED.fullmatch(mnemonic)
    child = node.children.get(match[1]) if match else None
    if match is None or child is None:
        raise ScpiError(-113)
    # There is one of everything in these instruments, and 1 is what a missing suffix means.
    if match[2] and int(match[2]) != 1:
        raise ScpiError(-114)
    return child
