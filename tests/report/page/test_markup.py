"""Text of a file can be nothing but text, wherever it stands."""

from __future__ import annotations

import base64
import json
from html.parser import HTMLParser

import pytest

from ehmo.report.page.markup import Markup, content_hash, data_address, element, embedded_json, markup, table

HOSTILE = "</script><script>alert(1)</script><img src=x onerror=alert(1)>\"'`&<!--\u2028\u202e\x00\x1b[31m]]>"


class Seen(HTMLParser):
    """Elements and text that a parser finds."""

    def __init__(self, html: str) -> None:
        super().__init__(convert_charrefs=True)
        self.elements: list[tuple[str, dict]] = []
        self.text = ""
        self.feed(html)
        self.close()

    def handle_starttag(self, tag, attrs):
        self.elements.append((tag, dict(attrs)))

    def handle_startendtag(self, tag, attrs):
        self.elements.append((tag, dict(attrs)))

    def handle_data(self, data):
        self.text += data


def test_text_and_attributes_are_escaped():
    seen = Seen(element("p", HOSTILE, title=HOSTILE))
    assert [tag for tag, _ in seen.elements] == ["p"]
    assert list(seen.elements[0][1]) == ["title"]
    for text in (seen.text, seen.elements[0][1]["title"]):
        assert "<script>alert(1)</script>" in text and "onerror" in text
        assert text.isprintable()
    assert Seen(markup([HOSTILE, None, [Markup("<b>x</b>"), "<i>"]])).elements == [("b", {})]


def test_names_of_elements_and_attributes_cannot_be_text():
    with pytest.raises(ValueError, match="names no element"):
        element("p onclick=x", "a")
    with pytest.raises(ValueError, match="names no attribute"):
        element("p", "a", **{"x onclick": "1"})


def test_embedded_json_ends_no_script_and_reads_back():
    text = embedded_json({HOSTILE: [HOSTILE, 1.5, None]})
    assert not set(text) & set("<>&\u2028\u2029")
    assert text.isascii()
    assert json.loads(text) == {HOSTILE: [HOSTILE, 1.5, None]}
    with pytest.raises(ValueError, match="Out of range"):
        embedded_json(float("nan"))


def test_table_has_caption_heads_and_text_only():
    seen = Seen(table([["bond", "n"], [HOSTILE, "2"]], HOSTILE, (1,)))
    tags = [tag for tag, _ in seen.elements]
    assert tags.count("caption") == 1 and tags.count("th") == 3 and tags.count("td") == 1
    assert "script" not in tags and "img" not in tags
    heads = [attributes["scope"] for tag, attributes in seen.elements if tag == "th"]
    assert heads == ["col", "col", "row"]


def test_hash_is_that_of_the_policy_standard():
    # SHA-256 of the sentence used in the examples of W3C Content Security Policy Level 2, section 4.2.4; memory.
    assert content_hash("alert('Hello, world.');") == "'sha256-qznLcsROx4GACP2dm0UCKCzCG+HiZ1guq6ZZDob/Tng='"


def test_download_holds_the_very_bytes():
    address = data_address("Å\n", "text/plain")
    assert base64.b64decode(address.removeprefix("data:text/plain;base64,")).decode() == "Å\n"
