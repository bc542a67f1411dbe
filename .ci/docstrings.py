"""Check that the docstrings of the public functions and classes say what they must.

    python .ci/docstrings.py bemt

In numpydoc sections: every parameter of a function, every field of a dataclass and every parameter of `__init__` is
described under Parameters and nothing else is; a function with parameters and a result has Returns or Yields; an error
of ours that is raised in the body stands under Raises. Commands of the program are exempt, their docstring is their
help. (General checkers do not see the fields of a dataclass, and most of our inputs are dataclasses.)
"""

from __future__ import annotations

import ast
import re
import sys
from collections.abc import Iterator
from pathlib import Path

OUR_ERRORS = {"InputError", "CaseError", "RunError", "MissingExtraError"}


def sections(docstring: str) -> dict[str, list[str]]:
    """Split a docstring into its sections; names in the first column are what each describes."""
    lines = ast.literal_eval(repr(docstring)).splitlines()
    margin = min((len(line) - len(line.lstrip()) for line in lines[1:] if line.strip()), default=0)
    lines = [lines[0], *(line[margin:] for line in lines[1:])]
    found: dict[str, list[str]] = {}
    current: list[str] | None = None
    for line, below in zip(lines, [*lines[1:], ""], strict=True):
        if line.strip() and re.fullmatch(r"-{3,}\s*", below):
            current = found.setdefault(line.strip(), [])
        elif current is not None and line and not line[0].isspace() and not re.fullmatch(r"-{3,}\s*", line):
            names = line.split(" : ")[0]
            current += [name.strip().lstrip("*") for name in names.split(",")]
    return found


def decorators(node: ast.FunctionDef | ast.AsyncFunctionDef | ast.ClassDef) -> set[str]:
    """Return the last names of the decorators."""
    plain = (entry.func if isinstance(entry, ast.Call) else entry for entry in node.decorator_list)
    return {entry.attr if isinstance(entry, ast.Attribute) else getattr(entry, "id", "") for entry in plain}


def parameters(node: ast.FunctionDef | ast.AsyncFunctionDef) -> list[str]:
    """Return the names of the parameters, without the object itself."""
    arguments = node.args
    every = [*arguments.posonlyargs, *arguments.args, *arguments.kwonlyargs]
    every += [extra for extra in (arguments.vararg, arguments.kwarg) if extra is not None]
    return [argument.arg for argument in every if argument.arg not in ("self", "cls")]


def raised(node: ast.AST) -> set[str]:
    """Return the errors of ours that the body raises by name."""
    calls = (child.exc for child in ast.walk(node) if isinstance(child, ast.Raise) and child.exc is not None)
    names = (call.func if isinstance(call, ast.Call) else call for call in calls)
    return {name.id for name in names if isinstance(name, ast.Name)} & OUR_ERRORS


def compare(wanted: list[str], described: list[str]) -> Iterator[str]:
    """Yield what is missing among the described names and what is too many."""
    missing, extra = sorted(set(wanted) - set(described)), sorted(set(described) - set(wanted))
    if missing:
        yield f"Parameters lacks {', '.join(missing)}"
    if extra:
        yield f"Parameters has {', '.join(extra)}, which is no parameter"


def check_function(node: ast.FunctionDef | ast.AsyncFunctionDef) -> Iterator[str]:
    """Yield what is wrong with the docstring of a function."""
    marks = decorators(node)
    if marks & {"overload", "command", "group"}:
        return
    docstring = ast.get_docstring(node)
    if docstring is None:
        yield "no docstring"
        return
    parts = sections(docstring)
    names = parameters(node)
    yield from compare(names, parts.get("Parameters", []))
    returns = ast.unparse(node.returns) if node.returns is not None else "None"
    if names and returns not in ("None", "NoReturn") and not {"Returns", "Yields"} & set(parts):
        yield "no section Returns"
    for error in sorted(raised(node) - set(parts.get("Raises", []))):
        yield f"raises {error} and has it not under Raises"


def check_class(node: ast.ClassDef) -> Iterator[tuple[int, str, str]]:
    """Yield what is wrong with a class and its public methods: line, name, message."""
    docstring = ast.get_docstring(node)
    if docstring is None:
        yield node.lineno, node.name, "no docstring"
        return
    wanted: list[str] | None = None
    if "dataclass" in decorators(node):
        fields = [
            entry for entry in node.body if isinstance(entry, ast.AnnAssign) and isinstance(entry.target, ast.Name)
        ]
        wanted = [
            entry.target.id
            for entry in fields
            if isinstance(entry.target, ast.Name)
            and not entry.target.id.startswith("_")
            and "ClassVar" not in ast.unparse(entry.annotation)
        ]
    for entry in node.body:
        if isinstance(entry, ast.FunctionDef) and entry.name == "__init__":
            wanted = parameters(entry)
    if wanted is not None:
        for message in compare(wanted, sections(docstring).get("Parameters", [])):
            yield node.lineno, node.name, message
    for entry in node.body:
        if isinstance(entry, ast.FunctionDef) and not entry.name.startswith("_"):
            for message in check_function(entry):
                yield entry.lineno, f"{node.name}.{entry.name}", message


def main(folders: list[str]) -> int:
    """Check every module under the folders; return the number of findings."""
    count = 0
    for path in sorted(path for folder in folders for path in Path(folder).rglob("*.py")):
        tree = ast.parse(path.read_text(encoding="utf-8"))
        for node in tree.body:
            found: list[tuple[int, str, str]] = []
            if isinstance(node, ast.ClassDef) and not node.name.startswith("_"):
                found = list(check_class(node))
            elif isinstance(node, ast.FunctionDef) and not node.name.startswith("_"):
                found = [(node.lineno, node.name, message) for message in check_function(node)]
            for line, name, message in found:
                print(f"{path}:{line}: {name}: {message}")
                count += 1
    return count


if __name__ == "__main__":
    sys.exit(min(main(sys.argv[1:] or ["bemt"]), 1))
