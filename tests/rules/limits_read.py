"""Which groups of the limits profile a rule's source reads, found in its syntax tree."""

from __future__ import annotations

import ast
from functools import cache
from pathlib import Path

ROOT = Path(__file__).parent.parent.parent
FOLLOWED = ("rules.decision", "rules.impossible", "rules.load_window", "rules.verdict")
"""Modules whose functions decide for the rules that call them."""


def groups_read(path: Path) -> set[str]:
    """Groups read in a rule's file, and in the functions of ``FOLLOWED`` that it uses."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    return _direct(tree) | _through(tree, _imported(tree), frozenset())


def _direct(tree: ast.AST) -> set[str]:
    """Of ``limits["group.key"]``, ``limits.word("group.key")``, ``limits.values("group")``, ``limits.citation("group")``."""
    found = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.Subscript) and _is_limits(node.value):
            found.add(_group(node.slice))
        elif (
            isinstance(node, ast.Call)
            and isinstance(node.func, ast.Attribute)
            and node.func.attr in ("word", "values", "citation")
            and _is_limits(node.func.value)
        ):
            found.add(_group(node.args[0]))
    return found


def _is_limits(node: ast.expr) -> bool:
    name = node.id if isinstance(node, ast.Name) else node.attr if isinstance(node, ast.Attribute) else ""
    return name in ("limits", "_limits")


def _group(node: ast.expr) -> str:
    """The group of a key; the key may end in something computed, ``f"length_doubt.{by}"``."""
    first = node.values[0] if isinstance(node, ast.JoinedStr) else node
    assert isinstance(first, ast.Constant), f"a key of limits that cannot be read: {ast.unparse(node)}"
    assert isinstance(first.value, str)
    return first.value.partition(".")[0]


def _imported(tree: ast.Module) -> dict[str, str]:
    return {
        alias.asname or alias.name: node.module or ""
        for node in tree.body
        if isinstance(node, ast.ImportFrom)
        for alias in node.names
    }


def _through(tree: ast.AST, imported: dict[str, str], seen: frozenset[tuple[str, str]]) -> set[str]:
    found: set[str] = set()
    for name in {node.id for node in ast.walk(tree) if isinstance(node, ast.Name)}:
        module = imported.get(name, "")
        if module in FOLLOWED and (module, name) not in seen:
            found |= _of_function(module, name, seen | {(module, name)})
    return found


def _of_function(module: str, name: str, seen: frozenset[tuple[str, str]]) -> set[str]:
    tree = _module(module)
    functions = {node.name: node for node in tree.body if isinstance(node, ast.FunctionDef)}
    if name not in functions:
        return set()
    here = dict.fromkeys(functions, module)
    return _direct(functions[name]) | _through(functions[name], _imported(tree) | here, seen)


@cache
def _module(name: str) -> ast.Module:
    return ast.parse((ROOT / f"{name.replace('.', '/')}.py").read_text(encoding="utf-8"))
