"""The tree as the tests of the house read it: files, their syntax, and how a rule is held.

A rule is a function from one source file to its findings. Every rule runs over the tree, and is
itself held against planted offences and against innocent look-alikes.
"""

from __future__ import annotations

import ast
import io
import re
import subprocess
import tokenize
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cache, cached_property
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
PACKAGES = ("app", "models", "migrations", "demo_data")

Finding = tuple[int, str]
Function = ast.FunctionDef | ast.AsyncFunctionDef


@dataclass(frozen=True)
class Source:
    """One Python file of the tree, or a planted one."""

    path: str
    text: str

    @cached_property
    def tree(self) -> ast.Module:
        return ast.parse(self.text, self.path)

    @property
    def parts(self) -> tuple[str, ...]:
        """Dotted name of the module in pieces; a package is its own name."""
        parts = self.path.removesuffix(".py").split("/")
        return tuple(parts[:-1] if parts[-1] == "__init__" else parts)

    @property
    def package(self) -> str:
        return self.parts[0]

    def functions(self) -> Iterator[Function]:
        return (node for node in ast.walk(self.tree) if isinstance(node, Function))

    def comments(self) -> Iterator[tuple[int, str]]:
        for token in tokenize.generate_tokens(io.StringIO(self.text).readline):
            if token.type == tokenize.COMMENT:
                yield token.start[0], token.string.lstrip("#").strip()

    def imports(self) -> Iterator[tuple[int, str]]:
        """Line and full dotted name of everything imported, relative imports resolved."""
        for node in ast.walk(self.tree):
            if isinstance(node, ast.Import):
                yield from ((node.lineno, alias.name) for alias in node.names)
            elif isinstance(node, ast.ImportFrom):
                here = self.path.removesuffix(".py").split("/")[: -node.level] if node.level else []
                origin = ".".join([*here, *([node.module] if node.module else [])])
                yield from ((node.lineno, f"{origin}.{alias.name}") for alias in node.names)

    def calls(self) -> Iterator[tuple[ast.Call, str]]:
        """Calls with the last name of what is called: ``connection.commit()`` is ``commit``."""
        for node in ast.walk(self.tree):
            if isinstance(node, ast.Call):
                called = node.func
                if isinstance(called, ast.Attribute):
                    yield node, called.attr
                elif isinstance(called, ast.Name):
                    yield node, called.id

    def strings(self) -> Iterator[tuple[int, str]]:
        for node in ast.walk(self.tree):
            if isinstance(node, ast.Constant) and isinstance(node.value, str):
                yield node.lineno, node.value


Rule = Callable[[Source], Iterator[Finding]]


@cache
def tracked() -> tuple[str, ...]:
    """Files of the project: what git has or would take, else what lies there but for build products."""
    command = ["git", "ls-files", "--cached", "--others", "--exclude-standard"]
    try:
        listed = subprocess.run(command, cwd=ROOT, check=True, capture_output=True, text=True).stdout
        names = listed.splitlines()
    except (OSError, subprocess.CalledProcessError):
        names = [str(path.relative_to(ROOT)) for path in ROOT.rglob("*") if path.is_file()]
        made = re.compile(
            r"(^|/)(\.[a-z_]+cache|\.venv|\.hypothesis|\.git|__pycache__|build|[^/]+\.egg-info)/"
        )
        names = [name for name in names if not made.search(name)]
    return tuple(sorted(name for name in names if (ROOT / name).is_file()))


@cache
def sources() -> tuple[Source, ...]:
    names = [
        name for name in tracked() if name.endswith(".py") and name.split("/")[0] in (*PACKAGES, "tests")
    ]
    return tuple(Source(name, (ROOT / name).read_text(encoding="utf-8")) for name in names)


def offences(rule: Rule, files: tuple[Source, ...]) -> list[str]:
    """What a rule finds, as ``path:line: what``."""
    return [f"{source.path}:{line}: {what}" for source in files for line, what in rule(source)]


def planted(rule: Rule, path: str, text: str) -> list[str]:
    """What a rule finds in a file that exists only here."""
    return offences(rule, (Source(path, text),))
