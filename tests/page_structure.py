"""The structure of an HTML page, for tests."""

from __future__ import annotations

import re
from html.parser import HTMLParser

__all__ = ["Structure", "assert_well_made"]

VOID = {"meta", "link", "br", "img", "input"}


class Structure(HTMLParser):
    """Tags with their attributes and the text within them."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.open: list[tuple[str, dict]] = []
        self.found: list[tuple[str, dict, list[str]]] = []
        self.stack: list[int] = []
        self.feed(page)
        self.close()

    def handle_starttag(self, tag, attrs):
        self.found.append((tag, dict(attrs), []))
        if tag not in VOID:
            self.stack.append(len(self.found) - 1)

    def handle_startendtag(self, tag, attrs):
        self.found.append((tag, dict(attrs), []))

    def handle_endtag(self, tag):
        last = self.stack.pop()
        assert self.found[last][0] == tag, f"{self.found[last][0]} is closed by {tag}"

    def handle_data(self, data):
        for place in self.stack:
            self.found[place][2].append(data)

    def all(self, *tags):
        return [(attrs, "".join(text)) for tag, attrs, text in self.found if tag in tags]


def assert_well_made(page: str) -> Structure:
    """Assert what holds for every page, and return its structure."""
    structure = Structure(page)
    ids = re.findall(r'\bid="([^"]*)"', page)
    assert len(set(ids)) == len(ids)
    wanted = re.findall(r'(?:href="#|aria-labelledby="|url\(#)([^")]+)', page)
    assert set(wanted) <= set(ids)
    assert len(structure.all("caption")) == len(structure.all("table"))
    assert all(attrs.get("scope") in ("col", "row") for attrs, _ in structure.all("th"))
    assert all(attrs.get("role") == "img" for attrs, _ in structure.all("svg"))
    assert len(structure.all("svg")) == len(structure.all("figcaption"))
    assert len(structure.all("script")) == 1
    for tag, attrs, _ in structure.found:
        for name in ("src", "href", "xlink:href", "data", "action"):
            address = attrs.get(name, "#")
            assert address.startswith(("#", "data:")), (tag, address)
    text = re.sub(r"<script>.*?</script>", "", page, flags=re.DOTALL)
    assert not re.search(r"\bnan\b|\binf\b|None", text)
    return structure
