"""XML parts of a workbook: small ones as trees, names without their namespace, no entities."""

from __future__ import annotations

import re
from collections.abc import Iterator
from xml.etree.ElementTree import Element, ParseError

from defusedxml import DefusedXmlException
from defusedxml.ElementTree import fromstring

from cellsim.errors import ModelError, Problem

_ESCAPE = re.compile(r"_x([0-9A-Fa-f]{4})_")


def parse_part(content: bytes, file: str, part: str) -> Element:
    """The root of a part.

    Raises:
        ModelError: It is not well-formed, or declares entities.
    """
    try:
        root: Element = fromstring(content, forbid_dtd=True)
    except ParseError as error:
        raise ModelError(
            Problem(file, f"the part {part} is not well-formed XML: {error}")
        ) from error
    except DefusedXmlException as error:
        raise refused(file, part) from error
    return root


def refused(file: str, part: str) -> ModelError:
    """What is said of a part that declares a document type or entities."""
    return ModelError(
        Problem(
            file,
            f"the part {part} declares a document type, which no workbook needs; it is refused",
        )
    )


def local(name: str) -> str:
    """A name without its namespace."""
    return name.rpartition("}")[2]


def children(element: Element, name: str) -> Iterator[Element]:
    """The children of that name."""
    return (child for child in element if local(child.tag) == name)


def child(element: Element, name: str) -> Element | None:
    """The first child of that name."""
    return next(children(element, name), None)


def attribute(element: Element, name: str) -> str | None:
    """An attribute, in whatever namespace it is written."""
    value = element.get(name)
    if value is not None:
        return value
    return next((v for key, v in element.attrib.items() if local(key) == name), None)


def is_on(value: str | None, *, default: bool = False) -> bool:
    """An XML boolean."""
    return default if value is None else value.strip().lower() in {"1", "true", "on"}


def unescape(text: str) -> str:
    """Text with the file format's `_x000D_` escapes undone (ECMA-376 Part 1, 22.9.2.19)."""
    if "_x" not in text:
        return text
    return _ESCAPE.sub(lambda match: chr(int(match[1], 16)), text)
