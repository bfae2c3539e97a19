"""XML parts as trees without name spaces, parsed with nothing that reaches out of the text: no document type, no entities."""

from __future__ import annotations

from xml.etree import ElementTree
from xml.etree.ElementTree import Element

from structviz.errors import FormatError

HINT = "the file is damaged, or made to do harm: export it again"
MARKS = ((b"\xef\xbb\xbf", "utf-8-sig"), (b"\xff\xfe", "utf-16"), (b"\xfe\xff", "utf-16"))
DEEPEST = 200


def tree_of(content: bytes, file: str) -> Element:
    """Return the root of an XML text, its tags and attribute names without name spaces; FormatError where it cannot be trusted."""
    coding = next((coding for mark, coding in MARKS if content.startswith(mark)), "utf-8")
    try:
        text = content.decode(coding)
    except UnicodeDecodeError as error:
        raise FormatError(file, f"text that is not UTF-8 ({error.reason} at {error.start})", "XML in UTF-8", hint=HINT) from None
    if "<!DOCTYPE" in text or "<!ENTITY" in text:
        raise FormatError(file, "XML with a document type or entities", "plain XML", hint=HINT)
    try:
        root = ElementTree.fromstring(text)
    except (ElementTree.ParseError, ValueError) as error:
        raise FormatError(file, f"XML that breaks off or is not well formed ({error})", "whole XML", hint=HINT) from None
    _without_name_spaces(root, file)
    return root


def _without_name_spaces(root: Element, file: str) -> None:
    level = [root]
    for _ in range(DEEPEST):
        for element in level:
            element.tag = local(element.tag)
            for key in [key for key in element.attrib if "}" in key]:
                element.attrib[local(key)] = element.attrib.pop(key)
        level = [child for element in level for child in element]
        if not level:
            return
    raise FormatError(file, f"XML nested more than {DEEPEST} deep", "a file of its format", hint=HINT)


def local(name: str) -> str:
    """Return a name without its name space.

    >>> local("{http://www.w3.org/2001/XMLSchema-instance}type"), local("eml:Title")
    ('type', 'Title')
    """
    return name.rpartition("}")[2].rpartition(":")[2]


def kind_of(element: Element) -> str:
    """Return the declared type of an element without prefix and `obj_`, its tag where none is declared."""
    return local(element.get("type", "")).removeprefix("obj_") or element.tag


def text_at(element: Element | None, path: str, default: str = "") -> str:
    """Return the trimmed text at a path below an element, or the default."""
    found = None if element is None else element.find(path)
    return default if found is None or found.text is None else found.text.strip()
