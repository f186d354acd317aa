"""YAML text to plain data, with the line of every key; whatever the text, the answer is data or faults."""

from __future__ import annotations

import warnings
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

from ruamel.yaml import YAML
from ruamel.yaml.error import MarkedYAMLError, ReusedAnchorWarning
from ruamel.yaml.nodes import MappingNode, Node, ScalarNode, SequenceNode
from ruamel.yaml.reader import ReaderError

from gridcarb.errors import Fault

KeyPath = tuple[str | int, ...]

# A recipe is a page or two. Beyond these the text is not a recipe, or aliases multiply it (an alias of an alias ...).
MOST_NODES = 20_000
MOST_DEPTH = 20


def dotted(path: KeyPath) -> str:
    """A key path as people read it: ``figures[0].depth``."""
    text = ""
    for part in path:
        text += f"[{part}]" if isinstance(part, int) else f".{part}" if text else part
    return text


@dataclass
class Parsed:
    """What a text says.

    data : plain mappings, lists and scalars; None if the text as a whole cannot be read.
    lines : key path -> line (1-based) of the key, or of the entry of a list; the empty path is the whole.
    faults : faults of the text itself.
    """

    data: dict[str, Any] | None = None
    lines: dict[KeyPath, int] = field(default_factory=dict)
    faults: list[Fault] = field(default_factory=list)

    def line(self, path: KeyPath) -> int:
        """The line of `path`, or of the nearest thing around it that is written down; 0 if nothing is."""
        while path and path not in self.lines:
            path = path[:-1]
        return self.lines.get(path, 0)


def parse(text: str) -> Parsed:
    """Read `text`; never raises."""
    try:
        root = _compose(text)
    except (MarkedYAMLError, ReaderError) as error:
        return Parsed(faults=[_syntax_fault(text, error)])
    except RecursionError:
        return Parsed(faults=[Fault(0, "", "brackets are nested too deep to be a recipe")])
    except Exception as error:  # the YAML library itself fails on some malformed escapes and directives
        return Parsed(faults=[Fault(0, "", f"the text cannot be read as YAML ({error})", "write plain keys and values")])
    if root is None or (isinstance(root, ScalarNode) and root.tag == "tag:yaml.org,2002:null"):
        return Parsed(faults=[Fault(1, "", "the recipe is empty", "begin with the line `recipe: 1`")])
    if not isinstance(root, MappingNode):
        return Parsed(faults=[Fault(
            _line(root), "", "a recipe is made of keys and values; this text is not", "begin with the line `recipe: 1`",
        )])
    builder = _Builder()
    data = builder.build(root, ())
    return Parsed(data if isinstance(data, dict) else None, builder.lines, builder.faults)


def _compose(text: str) -> Node | None:
    """The node tree of the text: tags are only looked at, never acted on."""
    yaml = YAML(typ="safe", pure=True)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", ReusedAnchorWarning)
        root: Node | None = yaml.compose(text)
    return root


def _line(node: Node) -> int:
    return int(node.start_mark.line) + 1


def _truth(value: str) -> bool:
    return value.lower() in {"true", "yes", "on"}


def _whole(value: str) -> int:
    digits = value.replace("_", "")
    based = digits.lstrip("+-").lower().startswith(("0x", "0o", "0b"))
    return int(digits, 0 if based else 10)


def _number(value: str) -> float:
    if value.lower().lstrip("+-") in {".inf", ".nan"}:
        raise ValueError("not finite")
    return float(value.replace("_", ""))


# Dates stay text: a recipe's dates may belong to calendars Python's do not know.
_SCALARS: dict[str, Callable[[str], object]] = {
    "null": lambda value: None, "bool": _truth, "int": _whole, "float": _number, "str": str, "timestamp": str, "merge": str,
}


class _Builder:
    """Walks the node tree once, gathering data, lines and faults."""

    def __init__(self) -> None:
        self.lines: dict[KeyPath, int] = {}
        self.faults: list[Fault] = []
        self._seen = 0

    def build(self, node: Node, path: KeyPath) -> object:
        """The plain data of `node`, which is found at `path`."""
        self.lines.setdefault(path, _line(node))
        self._seen += 1
        if self._seen > MOST_NODES or len(path) > MOST_DEPTH:
            if self._seen <= MOST_NODES + 1:
                self._seen = MOST_NODES + 1
                self._fault(path, "this is larger or nested deeper than a recipe can be", "write it out without aliases")
            return None
        kind = str(node.tag).removeprefix("tag:yaml.org,2002:")
        if isinstance(node, MappingNode) and kind == "map":
            return self._mapping(node, path)
        if isinstance(node, SequenceNode) and kind == "seq":
            return [self.build(entry, (*path, number)) for number, entry in enumerate(node.value)]
        if isinstance(node, ScalarNode) and kind in _SCALARS:
            return self._scalar(node, kind, path)
        self._fault(path, f"the tag '{kind}' has no meaning in a recipe", "remove the word that begins with '!'")
        return None

    def _mapping(self, node: MappingNode, path: KeyPath) -> dict[str, object]:
        found: dict[str, object] = {}
        for key_node, value_node in node.value:
            if not isinstance(key_node, ScalarNode):
                self.faults.append(Fault(_line(key_node), dotted(path), "a key must be one word", "remove the brackets"))
                continue
            key = str(key_node.value)
            here = (*path, key)
            if key in found:
                what = f"'{key}' is written twice, first on line {self.lines[here]}"
                self.faults.append(Fault(_line(key_node), dotted(here), what, "keep one of the two"))
                continue
            self.lines[here] = _line(key_node)
            found[key] = self.build(value_node, here)
        return found

    def _scalar(self, node: ScalarNode, kind: str, path: KeyPath) -> object:
        try:
            return _SCALARS[kind](node.value)
        except ValueError:
            what = f"'{node.value[:40]}' is not a number a recipe can use"
            self._fault(path, what, "write a finite number, or put text in quotes")
            return None

    def _fault(self, path: KeyPath, what: str, mend: str) -> None:
        self.faults.append(Fault(self.lines[path], dotted(path), what, mend))


# What the YAML library says of a text it cannot read -> what to say to the person who wrote it.
_SYNTAX: tuple[tuple[str, str, str], ...] = (
    (r"'\t' that cannot start", "a tab cannot be used here", "indent with spaces"),
    ("character '%' that cannot start", "text cannot begin with '%'", "put the text in quotes"),
    ("character '@' that cannot start", "text cannot begin with '@'", "put the text in quotes"),
    ("character '`' that cannot start", "text cannot begin with '`'", "put the text in quotes"),
    ("mapping values are not allowed", "a colon stands where none can stand, or the line is indented too far",
     "put text that contains ': ' in quotes; let the keys of one section begin in the same column"),
    ("could not find expected ':'", "a key without a colon", "write `key: value`"),
    ("expected ',' or ']'", "a bracket '[' is opened and not closed", "close it with ']'"),
    ("expected ',' or '}'", "a bracket '{' is opened and not closed", "close it with '}'"),
    ("expected <block end>", "this line does not fit the lines above it",
     "let the keys of one section begin in the same column, and lists with '- '"),
    ("found undefined alias", "a word that begins with '*' refers to something not written above",
     "put the text in quotes (a glob such as '*.nc' needs them)"),
    ("expected alphabetic or numeric character", "a word cannot begin with '*' or '&'",
     "put the text in quotes (a glob such as '*.nc' needs them)"),
    ("but found another document", "a second recipe begins here", "keep one recipe a file: remove the line `---`"),
    ("unexpected end of stream", "a quotation mark is opened and not closed", "close the quotation mark"),
    ("unexpected document separator", "a quotation mark is opened and not closed", "close the quotation mark"),
)


def _syntax_fault(text: str, error: MarkedYAMLError | ReaderError) -> Fault:
    if isinstance(error, ReaderError):
        line = text[: int(error.position)].count("\n") + 1
        return Fault(line, "", "a character that cannot stand in a text file", "remove the control character")
    problem = str(error.problem or error.context or "")
    # An unclosed quotation mark or bracket is found at the end; where it was opened helps more.
    opened = "unexpected end" in problem or "unexpected document" in problem or "expected ',' or" in problem
    mark = error.context_mark if opened and error.context_mark else error.problem_mark or error.context_mark
    line = int(mark.line) + 1 if mark else 0
    for sign, what, mend in _SYNTAX:
        if sign in problem:
            return Fault(line, "", what, mend)
    return Fault(line, "", f"the text cannot be read as YAML here ({problem})", "write plain keys and values")
