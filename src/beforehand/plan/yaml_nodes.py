"""Strict YAML: mappings, lists and text with their lines, and nothing else.

YAML guesses types (``no`` is false, ``012`` is ten, ``1:30`` is ninety) and has anchors, tags and
several documents. Nothing of that belongs in a plan or a lock: each is a fault with its line. What
comes out is plain data whose unquoted texts are still ``Plain``, so that the field decides the type.

Reading goes over the parser's events without recursion, so that no nesting and no alias can cost more
than the length of the text.
"""

from __future__ import annotations

import functools
import re
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from beforehand.faults import Fault, InputError, PlanError
from beforehand.plan.places import keyed
from beforehand.plan.written import Plain
from beforehand.plan.yaml_words import MOST_DEPTH, STRANGE_IN_VALUE, TOO_DEEP, in_plain_words

if TYPE_CHECKING:
    import yaml

# More than any plan that people review; bounds the work on a hostile file.
MOST_BYTES = 2_000_000

# Characters that a text file has no business with: control characters but tab and line ends, halves
# of surrogate pairs, and the marks of byte order inside a text.
_STRANGE = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x84\x86-\x9f\ud800-\udfff\ufeff\ufffe\uffff]")

NULLS = ("", "~", "null", "Null", "NULL")

# More faults than a person reads; beyond them the file is something else than a plan.
MOST_FAULTS = 100

Data = Any


@dataclass(frozen=True, slots=True, kw_only=True)
class YamlFault:
    """What in a text is not plain YAML.

    Attributes
    ----------
    line : int or None
        From 1; None where the whole file is meant.
    place : str
        Path of the value, empty where it has none.
    what : str
    code : str
    """

    line: int | None
    what: str
    code: str = "yaml"
    place: str = ""

    def named(self, name: str) -> Fault:
        """The fault with the name of its file."""
        return Fault(file=name, line=self.line, place=self.place, what=self.what, code=self.code)


class NotYamlError(ValueError):
    """Raised inside this module's readers where reading cannot go on; carries one fault."""

    def __init__(self, line: int | None, what: str, code: str = "yaml") -> None:
        super().__init__(what)
        self.fault = YamlFault(line=line, what=what, code=code)


@dataclass(frozen=True, slots=True, kw_only=True)
class Document:
    """What a YAML text holds.

    Attributes
    ----------
    data : dict
        Mappings as dicts, lists as tuples, quoted text as ``str``, unquoted as ``Plain``, null as None.
    lines : mapping of str to int
        Path of every key and item (``predictors[2].range``) to its line, from 1; empty if not asked for.
    faults : tuple of YamlFault
        Aliases, anchors, tags and duplicate keys, which do not keep the rest from being read.
    """

    data: dict[str, Data]
    lines: Mapping[str, int]
    faults: tuple[YamlFault, ...]


def decoded(raw: bytes, *, most_bytes: int = MOST_BYTES) -> str:
    """The text of a file: UTF-8 and of bounded size; a byte order mark is taken off.

    Raises
    ------
    NotYamlError
        When the bytes are none.
    """
    if len(raw) > most_bytes:
        raise NotYamlError(None, f"is larger than {most_bytes:,} bytes", "size")
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        raise NotYamlError(line, "is not UTF-8 text; save it as UTF-8", "encoding") from None


def document_of(text: str, *, lines: bool = True) -> Document:
    """Read a text that holds one mapping.

    Parameters
    ----------
    text : str
    lines : bool
        Whether the lines are wanted; a third of the time of a long text goes into them.

    Raises
    ------
    NotYamlError
        Where the text breaks off being YAML.
    """
    return _Builder(text, lines=lines).build()


def read_yaml(
    raw: bytes,
    name: str,
    *,
    error: type[InputError] = PlanError,
    most_bytes: int = MOST_BYTES,
    lines: bool = True,
) -> Document:
    """Read the bytes of a file, or raise ``error`` with every fault found."""
    try:
        document = document_of(decoded(raw, most_bytes=most_bytes), lines=lines)
    except NotYamlError as broken:
        raise error([broken.fault.named(name)]) from None
    if document.faults:
        raise error([fault.named(name) for fault in document.faults])
    return document


class _Open:
    """A mapping or list that is being read: its path, content and, in a mapping, pending key."""

    __slots__ = ("items", "key", "keyed", "path")

    def __init__(self, path: str, *, keyed: bool) -> None:
        self.path = path
        self.keyed = keyed
        self.items: Any = {} if keyed else []
        self.key: str | None = None


class _Builder:
    """Builds data and lines from the events of the parser."""

    def __init__(self, text: str, *, lines: bool) -> None:
        self._text = text.removeprefix("\ufeff")
        self._open: list[_Open] = []
        self._root: Data = None
        self._lines: dict[str, int] = {}
        self._with_lines = lines
        self._documents = 0
        self._faults: list[YamlFault] = []
        # Where text stands, for telling a tab inside a text from one outside; kept only if needed.
        self._spans: list[tuple[int, int]] | None = [] if "\t" in text else None

    def build(self) -> Document:
        """The only document."""
        import yaml

        _refuse_strange(self._text)
        take: dict[type, Callable[[Any], None]] = {
            yaml.ScalarEvent: self._scalar,
            yaml.MappingStartEvent: functools.partial(self._start, keyed=True),
            yaml.SequenceStartEvent: functools.partial(self._start, keyed=False),
            yaml.MappingEndEvent: self._end,
            yaml.SequenceEndEvent: self._end,
            yaml.AliasEvent: self._alias,
            yaml.DocumentStartEvent: self._document,
        }
        for event in _events(self._text):
            taker = take.get(type(event))
            if taker is not None:
                taker(event)
        self._refuse_tabs()
        if self._root is None and not self._faults:
            raise NotYamlError(1, "is empty", "empty")
        if not isinstance(self._root, dict):
            raise NotYamlError(1, "must be a mapping of keys, such as title: …")
        return Document(data=self._root, lines=self._lines, faults=tuple(self._faults))

    def _document(self, event: Any) -> None:
        """The start of a document, of which there is one."""
        self._documents += 1
        if self._documents > 1:
            raise NotYamlError(_line(event), "starts a second document; a file holds one", "documents")
        if event.tags:
            self._fault(event, "declares tags; only plain data is read", "tag")

    def _scalar(self, event: Any) -> None:
        """Take a text: the key of a mapping, or a value."""
        if event.anchor is not None or event.tag is not None:
            self._decorated(event)
        value: str = event.value
        quoted = bool(event.style)
        if event.style == '"' and STRANGE_IN_VALUE.search(value):
            self._fault(event, "has a control character in its text", "character")
            value = STRANGE_IN_VALUE.sub("?", value)
        if self._spans is not None:
            self._spans.append((event.start_mark.index, event.end_mark.index))
        holder = self._open[-1] if self._open else None
        if holder is not None and holder.keyed and holder.key is None:
            self._key(holder, value, event)
            return
        if self._with_lines:
            self._note(event)
        self._place(value if quoted else None if value in NULLS else Plain(value))

    def _key(self, holder: _Open, key: str, event: Any) -> None:
        """Take a key: a text that stands only once in its mapping."""
        holder.key = key
        path = keyed(holder.path, key) if self._with_lines else key
        if key in holder.items:
            before = f" (first in line {self._lines[path]})" if self._with_lines else ""
            self._fault(event, f"stands twice{before}", "duplicate_key", path)
            return
        if key == "<<" and not event.style:
            self._fault(event, "merges a mapping with <<; write the keys out", "alias")
        if self._with_lines:
            self._lines[path] = _line(event)

    def _start(self, event: Any, *, keyed: bool) -> None:
        """Open a mapping or list."""
        if event.anchor is not None or event.tag is not None:
            self._decorated(event)
        holder = self._open[-1] if self._open else None
        if holder is not None and holder.keyed and holder.key is None:
            raise NotYamlError(_line(event), "has a mapping or list for a key; a key is text", "key")
        if len(self._open) == MOST_DEPTH:
            raise NotYamlError(_line(event), TOO_DEEP, "depth")
        if self._with_lines:
            self._note(event)
        path = self._path() if self._with_lines else ""
        self._open.append(_Open(path, keyed=keyed))

    def _end(self, event: Any) -> None:
        """Close a mapping or list."""
        done = self._open.pop()
        self._place(done.items if done.keyed else tuple(done.items))

    def _alias(self, event: Any) -> None:
        """An alias stands for nothing here."""
        holder = self._open[-1] if self._open else None
        self._fault(event, f"has an alias, *{event.anchor}; write the value out", "alias")
        if holder is not None and holder.keyed and holder.key is None:
            raise NotYamlError(_line(event), "has an alias for a key; a key is text", "key")
        self._place(None)

    def _path(self) -> str:
        """Path of what comes next."""
        if not self._open:
            return ""
        holder = self._open[-1]
        if holder.keyed:
            return keyed(holder.path, holder.key or "")
        return f"{holder.path}[{len(holder.items)}]"

    def _note(self, event: Any) -> None:
        """Note the line of an item of a list; a mapping's value has the line of its key."""
        if self._open and not self._open[-1].keyed:
            self._lines[self._path()] = _line(event)

    def _place(self, value: Data) -> None:
        """Put a finished value where it belongs; of a key that stands twice, the first counts."""
        if not self._open:
            self._root = value
            return
        holder = self._open[-1]
        if holder.keyed:
            holder.items.setdefault(holder.key, value)
            holder.key = None
        else:
            holder.items.append(value)

    def _decorated(self, event: Any) -> None:
        """Anchors and tags are no plain data."""
        if event.anchor is not None:
            self._fault(event, f"has an anchor, &{event.anchor}; only plain data is read", "alias")
        if event.tag is not None:
            self._fault(event, f"has a tag, {event.tag}; only plain data is read", "tag")

    def _fault(self, event: Any, what: str, code: str, place: str = "") -> None:
        """Note a fault that does not keep the rest from being read."""
        if len(self._faults) == MOST_FAULTS:
            raise NotYamlError(_line(event), "has more faults than are listed; little of it is plain YAML")
        pending = bool(self._open) and self._open[-1].keyed and self._open[-1].key is None
        found = place or ("" if pending or not self._with_lines else self._path())
        self._faults.append(YamlFault(line=_line(event), what=what, code=code, place=found))

    def _refuse_tabs(self) -> None:
        """A tab outside texts and comments: parsers disagree on what it means."""
        if self._spans is None:
            return
        spans = iter(self._spans)
        start, end = next(spans, (len(self._text), len(self._text) + 1))
        for found in re.finditer("\t", self._text):
            at = found.start()
            while end <= at:
                start, end = next(spans, (len(self._text), len(self._text) + 1))
            before = self._text[self._text.rfind("\n", 0, at) + 1 : at]
            if at < start and not re.search(r"(?:^|\s)#", before):
                line = self._text.count("\n", 0, at) + 1
                raise NotYamlError(line, "has a tab between its words; YAML wants blanks", "tab")


def _line(event: Any) -> int:
    """Line of an event, from 1."""
    return int(event.start_mark.line) + 1


def _refuse_strange(text: str) -> None:
    """Control characters and broken characters, which no text holds."""
    found = _STRANGE.search(text)
    if found is not None:
        line = text.count("\n", 0, found.start()) + 1
        what = f"has the control character U+{ord(found.group()):04X}; the file is not plain text"
        raise NotYamlError(line, what, "character")


def _events(text: str) -> Iterator[yaml.Event]:
    """Events of the parser; what it refuses becomes a fault in plain words."""
    import yaml

    loader = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
    try:
        yield from yaml.parse(text, Loader=loader)
    except yaml.YAMLError as error:
        mark = getattr(error, "problem_mark", None) or getattr(error, "context_mark", None)
        line = None if mark is None else min(int(mark.line), text.count("\n")) + 1
        raise NotYamlError(line, in_plain_words(error, text, line)) from None


# What reads as a number in YAML 1.2, and as one in 1.1 when it has a dot and a signed exponent.
_NUMBER = re.compile(r"[-+]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][-+]?\d+)?")
_MOST_DIGITS = 400


def typed(data: Data) -> Data:
    """Plain data with unquoted texts typed by what they look like, as a record is written.

    ``true`` and ``false`` are truth values, what reads as a number is an ``int`` or a ``float``, all
    else is text. Lists stay tuples.
    """
    if isinstance(data, dict):
        return {key: typed(value) for key, value in data.items()}
    if isinstance(data, tuple):
        return tuple([typed(item) for item in data])
    if type(data) is not Plain:
        return data
    if data in ("true", "false"):
        return data == "true"
    if _NUMBER.fullmatch(data) and len(data) <= _MOST_DIGITS:
        return int(data) if data.lstrip("+-").isdecimal() else float(data)
    return str(data)
