"""Is every constant of the models felt? Nudge each by 1 % and see whether a test fails.

Run on demand: ``python tests/felt_audit.py [--module models/vapour] [--sample 50] [--jobs 2] [--list]``.
The tree is copied for each job and only the copy is changed. One process imports the libraries
once and forks for each nudge, so that a nudge costs its tests and little else.

What counts as a constant:

- a float in a module-level (or class-level) assignment of ``models/``, however deep in tuples,
  dictionaries and calls, and a number in a JSON or CSV file under ``models/``;
- an integer only beside a float in one row (innermost tuple, list, dictionary, call or CSV line): there
  it is a coefficient that happens to be whole. Elsewhere an integer is structure: a count, a power, an index;
- with ``--bodies`` also floats inside functions and their defaults, but for 0.5, 0.25, powers of ten
  and whole numbers up to 12, which are arithmetic;
- never 0.0, which 1 % does not change, nor a number of the method instead of the physics: a name that ends
  as in ``NUMERICAL``. How many were left out for their name is printed.

A nudge is felt if a test fails, cannot be collected, or does not end within ``--limit`` seconds. A module's
own tests are its mirror and the files of tests/models and tests/published that import it; what they
do not feel is tried on the mirrors of the modules that import it, and counted apart ("by users").
"""

from __future__ import annotations

import argparse
import ast
import json
import os
import random
import re
import shutil
import signal
import sys
import tempfile
from collections import defaultdict
from collections.abc import Iterator
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from functools import cache
from itertools import repeat
from multiprocessing import get_context
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
NUDGE = 1.01
# Numbers of the method: what an iteration, a grid or a comparison of floats needs. ROUNDING and ROOM are allowed in a
# comparison; at TRUSTED an inverse counts as lost to rounding; coefficients below NEGLIGIBLE are cut; at SMALL_ANGLE a
# series takes over from a formula that agrees with it to the last bits; LARGEST_RATIO begins a search above the
# largest root, 3; Trust.power is the power of a ratio that is zero unless a form gives both. Names as ROWS, POINTS or
# KNOTS are not among them: a table of floats is data whatever it is called, and a count is an integer, never counted.
NUMERICAL = re.compile(
    r"(TOLERANCE|ITERATIONS|EPSILON|TINY|STEPS?|DEGREE|NODES|BLOCK"
    r"|ROUNDING|ROOM|TRUSTED|NEGLIGIBLE|SMALL_ANGLE|LARGEST_RATIO|Trust\.power)$"
)
# Tests that feel a module without naming it.
FURTHER: dict[str, tuple[str, ...]] = {}


@dataclass(frozen=True)
class Number:
    """One number in one file: bytes ``start`` to ``end``, its value and how to name it."""

    path: str
    start: int
    end: int
    line: int
    name: str
    value: float

    @property
    def label(self) -> str:
        return f"{self.path}:{self.line} {self.name} = {self.value!r}"


# --- finding the numbers ------------------------------------------------------------------------


class Rows:
    """Numbers grouped by the row they stand in; a row counts if it holds a float."""

    def __init__(self) -> None:
        self.rows: dict[int, list[tuple[Number, bool]]] = defaultdict(list)

    def add(self, row: int, number: Number, whole: bool) -> None:
        self.rows[row].append((number, whole))

    def counted(self) -> Iterator[Number]:
        for row in self.rows.values():
            if any(not whole for _, whole in row):
                yield from (number for number, _ in row if number.value != 0.0)


def python_numbers(path: str, text: bytes, bodies: bool) -> Iterator[Number]:
    starts = [0]
    for line in text.splitlines(keepends=True):
        starts.append(starts[-1] + len(line))
    rows = Rows()

    def visit(node: ast.AST, row: int, name: str) -> None:
        if isinstance(node, ast.Constant):
            if isinstance(node.value, int | float) and not isinstance(node.value, bool):
                rows.add(row, located(path, starts, node, name, node.value), isinstance(node.value, int))
        elif isinstance(node, ast.Dict):
            for key, value in zip(node.keys, node.values, strict=True):
                inner = f"{name}[{ast.unparse(key)}]" if key is not None else name
                visit(value, id(node), inner)
        elif not isinstance(node, ast.Subscript | ast.Lambda):
            own = isinstance(node, ast.Tuple | ast.List | ast.Set | ast.Call)
            title = row_title(node)
            for child in ast.iter_child_nodes(node):
                visit(child, id(node) if own else row, f"{name}[{title}]" if title else name)

    tree = ast.parse(text)
    for name, value in assigned(tree.body):
        visit(value, id(value), name)
    yield from rows.counted()
    if bodies:
        yield from body_numbers(path, starts, tree)


def located(path: str, starts: list[int], node: ast.Constant, name: str, value: float) -> Number:
    """The number that a constant of the syntax tree is, at its place in bytes."""
    start = starts[node.lineno - 1] + node.col_offset
    end = starts[(node.end_lineno or node.lineno) - 1] + (node.end_col_offset or 0)
    return Number(path, start, end, node.lineno, name, float(value))


def row_title(node: ast.AST) -> str:
    """The text that a row of a table begins with: the substance whose row it is."""
    first: list[ast.expr] = []
    if isinstance(node, ast.Tuple | ast.List):
        first = node.elts[:1]
    elif isinstance(node, ast.Call):
        first = node.args[:1]
    texts = [item.value for item in first if isinstance(item, ast.Constant) and isinstance(item.value, str)]
    return texts[0] if texts else ""


def assigned(body: list[ast.stmt]) -> Iterator[tuple[str, ast.expr]]:
    """Names and values of the assignments of a module and of its classes."""
    for statement in body:
        if isinstance(statement, ast.ClassDef):
            yield from ((f"{statement.name}.{name}", value) for name, value in assigned(statement.body))
        elif isinstance(statement, ast.Assign):
            yield ast.unparse(statement.targets[0]), statement.value
        elif isinstance(statement, ast.AnnAssign) and statement.value is not None:
            yield ast.unparse(statement.target), statement.value


def body_numbers(path: str, starts: list[int], tree: ast.Module) -> Iterator[Number]:
    """Floats in functions and their defaults that are not plain arithmetic."""
    functions = [node for node in ast.walk(tree) if isinstance(node, ast.FunctionDef)]
    seen: set[int] = set()
    for function in functions:
        for node in ast.walk(function):
            if not (isinstance(node, ast.Constant) and isinstance(node.value, float)) or id(node) in seen:
                continue
            seen.add(id(node))
            value = node.value
            plain = value in (0.0, 0.5, 0.25) or (value == int(value) and abs(value) <= 12)
            if not plain and not re.fullmatch(r"1e[+-]?\d+|10*\.0|0\.0*1", repr(value)):
                yield located(path, starts, node, f"{function.name}()", value)


def json_numbers(path: str, text: bytes) -> Iterator[Number]:
    rows = Rows()
    stack, made, key = [0], 0, ""
    token = re.compile(rb'"(?:\\.|[^"\\])*"|-?\d+(?:\.\d+)?(?:[eE][+-]?\d+)?|[\[\]{}]')
    for match in token.finditer(text):
        piece = match[0]
        if piece in b"[{":
            made += 1
            stack.append(made)
        elif piece in b"]}":
            stack.pop()
        elif piece.startswith(b'"'):
            key = str(json.loads(piece))
        else:
            whole = piece.lstrip(b"-").isdigit()
            line = text.count(b"\n", 0, match.start()) + 1
            rows.add(stack[-1], Number(path, *match.span(), line, key, float(piece)), whole)
    yield from rows.counted()


def csv_numbers(path: str, text: bytes) -> Iterator[Number]:
    rows = Rows()
    offset = 0
    for line, content in enumerate(text.splitlines(keepends=True), 1):
        for match in re.finditer(rb"(?<![^,;\s])-?\d+(?:\.\d+)?(?:[eE][+-]?\d+)?(?![^,;\s])", content):
            whole = match[0].lstrip(b"-").isdigit()
            number = Number(path, offset + match.start(), offset + match.end(), line, "cell", float(match[0]))
            rows.add(line, number, whole)
        offset += len(content)
    yield from rows.counted()


def numbers(path: Path, bodies: bool) -> list[Number]:
    name, text = str(path.relative_to(ROOT)), path.read_bytes()
    if path.suffix == ".py":
        return list(python_numbers(name, text, bodies))
    return list(json_numbers(name, text) if path.suffix == ".json" else csv_numbers(name, text))


def physical(number: Number) -> bool:
    return NUMERICAL.search(number.name.split("[")[0]) is None


# --- which tests --------------------------------------------------------------------------------


def mirror(module: str) -> str:
    folder, _, name = module.rpartition("/")
    return f"tests/{folder}/test_{name}"


@cache
def imported(path: str) -> frozenset[str]:
    """Paths under models/ that a file imports."""
    found: set[str] = set()
    for node in ast.walk(ast.parse((ROOT / path).read_bytes())):
        names: list[str] = []
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom) and node.module:
            names = [node.module, *(f"{node.module}.{alias.name}" for alias in node.names)]
        found |= {name.replace(".", "/") + ".py" for name in names if name.startswith("models")}
    return frozenset(name for name in found if (ROOT / name).is_file())


def code(folder: str) -> list[str]:
    return sorted(str(path.relative_to(ROOT)) for path in (ROOT / folder).rglob("*.py"))


def readers(path: str) -> list[str]:
    """Modules that read a data file: those of its folder that spell its name."""
    near = (ROOT / path).parent
    modules = [*near.glob("*.py"), *near.parent.glob("*.py")]
    return [str(module.relative_to(ROOT)) for module in modules if Path(path).name in module.read_text()]


def tests_of(path: str) -> tuple[list[str], list[str]]:
    """Test files that should feel a file of models/, and those that feel it by way of its users."""
    modules = {path} if path.endswith(".py") else set(readers(path))
    own = [mirror(module) for module in modules]
    every = [test for folder in ("tests/models", "tests/published") for test in code(folder) if "/test_" in test]
    own += [test for test in every if imported(test) & modules]
    own += [test for module in modules for test in FURTHER.get(module, ())]
    users = [mirror(user) for user in code("models") if imported(user) & modules]
    first = [test for test in dict.fromkeys(own) if (ROOT / test).is_file()]
    second = [test for test in dict.fromkeys(users) if (ROOT / test).is_file() and test not in first]
    return first, second


# --- nudging ------------------------------------------------------------------------------------

TREE = Path()
HUNG = 98  # beside the exit codes of pytest, 0 to 5


def prepare(home: str, libraries: tuple[str, ...]) -> None:
    """A copy of the tree for one job, and the libraries that every test imports, imported once."""
    global TREE
    TREE = Path(tempfile.mkdtemp(dir=home))
    skip = shutil.ignore_patterns("__pycache__", ".*_cache", ".hypothesis", "*.db")
    for name in ("models", "tests", "app"):
        shutil.copytree(ROOT / name, TREE / name, ignore=skip)
    shutil.copy2(ROOT / "pyproject.toml", TREE)
    os.chdir(TREE)
    elsewhere = [path for path in sys.path if path and Path(path) not in (ROOT, ROOT / "tests")]
    sys.path[:] = [str(TREE), *elsewhere]
    for library in libraries:
        __import__(library)


def run_tests(tests: list[str], limit: int, write: bool) -> int:
    """Exit code of pytest in a forked process: the caller's modules stay as they are."""
    child = os.fork()
    if child == 0:
        try:
            signal.alarm(limit)
            sys.dont_write_bytecode = not write
            silence = os.open(os.devnull, os.O_WRONLY)
            os.dup2(silence, 1)
            os.dup2(silence, 2)
            os._exit(pytest_code(tests))
        finally:
            os._exit(99)
    status = os.waitpid(child, 0)[1]
    hung = os.WIFSIGNALED(status) and os.WTERMSIG(status) == signal.SIGALRM
    return HUNG if hung else os.waitstatus_to_exitcode(status)


def pytest_code(tests: list[str]) -> int:
    import pytest
    from hypothesis import Phase, settings

    quick = [Phase.explicit, Phase.generate]  # which example fails is of no interest here
    settings.register_profile("audit", phases=quick, database=None, derandomize=True)
    settings.load_profile("audit")
    early = "ignore::pytest.PytestAssertRewriteWarning"  # hypothesis was imported before the fork
    return int(pytest.main(["-x", "-q", "-p", "no:cacheprovider", "--tb=no", "-W", early, *tests]))


def baseline(test: str, limit: int) -> bool:
    """Whether a test file passes, and tests anything, on the tree as it is."""
    return run_tests([test], limit, write=True) == 0


def felt(number: Number, tests: tuple[list[str], list[str]], limit: int) -> int:
    """Which tests fail when this number is 1 % larger: 1 its own, 2 those of its users, 0 none."""
    file = TREE / number.path
    before, stamp = file.read_bytes(), file.stat()
    nudged = repr(number.value * NUDGE).encode()
    file.write_bytes(before[: number.start] + nudged + before[number.end :])
    try:
        for circle, names in enumerate(tests, 1):
            answer = run_tests(names, limit, write=False) if names else 0
            if answer not in (0, 1, 2, HUNG):
                raise RuntimeError(f"pytest ended with {answer} for {number.label}")
            if answer:
                return circle
    finally:
        file.write_bytes(before)
        os.utime(file, ns=(stamp.st_atime_ns, stamp.st_mtime_ns))
    return 0


def libraries_of_tests() -> tuple[str, ...]:
    """Installed libraries that the tests import; importing them before the fork is what makes it fast."""
    wanted = {"numpy", "scipy", "pytest", "hypothesis"}
    known = ("CoolProp", "fluids", "chemicals", "scipy")
    for path in [*code("tests/models"), *code("tests/published"), *code("models")]:
        text = (ROOT / path).read_text()
        for name in re.findall(r"^(?:from|import) ([\w.]+)", text, re.MULTILINE):
            if name.split(".")[0] in known:
                wanted.add(name)
    return tuple(sorted(wanted))


def audit(chosen: list[Number], jobs: int, limit: int) -> tuple[dict[Number, int], list[str]]:
    """Who felt each number, and what could not be judged with the reason."""
    tests = {path: tests_of(path) for path in {number.path for number in chosen}}
    named = sorted({test for circles in tests.values() for names in circles for test in names})
    with tempfile.TemporaryDirectory() as home:
        prepared = (home, libraries_of_tests())
        with ProcessPoolExecutor(jobs, get_context("fork"), initializer=prepare, initargs=prepared) as pool:
            passes = dict(zip(named, pool.map(baseline, named, repeat(600)), strict=True))
            fit = {path: tuple([n for n in names if passes[n]] for names in both) for path, both in tests.items()}
            judged = [number for number in chosen if any(fit[number.path])]
            results: dict[Number, int] = {}
            answers = pool.map(felt, judged, [fit[number.path] for number in judged], repeat(limit))
            for done, (number, circle) in enumerate(zip(judged, answers, strict=True), 1):
                results[number] = circle
                if sys.stderr.isatty():
                    end = "\n" if done == len(judged) else "\r"
                    print(f"{done}/{len(judged)}", end=end, file=sys.stderr, flush=True)
    failing = [f"{test}: does not pass as it is, not used" for test in named if not passes[test]]
    return results, failing + [f"{path}: no test to feel it" for path in sorted(fit) if not any(fit[path])]


def row(title: str, circles: list[int]) -> str:
    own, users, none = (circles.count(circle) for circle in (1, 2, 0))
    return f"{title:36} {len(circles):7} {own:8} {users:9} {none:6} {100.0 * (own + users) / len(circles):7.1f}"


def table(results: dict[Number, int], refused: list[str]) -> str:
    lines = [f"{'file':36} {'numbers':>7} {'by own':>8} {'by users':>9} {'unfelt':>6} {'felt %':>7}"]
    for path in sorted({number.path for number in results}):
        lines.append(row(path, [circle for number, circle in results.items() if number.path == path]))
    if results:
        lines.append(row("all", list(results.values())))
    lines += [f"unfelt: {number.label}" for number, circle in results.items() if not circle]
    return "\n".join([*lines, *(f"not judged: {reason}" for reason in refused)])


def arguments() -> argparse.Namespace:
    parser = argparse.ArgumentParser(description="Nudge every constant of models/ by 1 %%.")
    parser.add_argument("--module", action="append", help="file or folder under models/; may be repeated")
    parser.add_argument("--sample", type=int, help="so many numbers of each file, drawn with a fixed seed")
    parser.add_argument("--jobs", type=int, default=2)
    parser.add_argument("--limit", type=int, default=120, help="seconds for the tests of one nudge")
    parser.add_argument("--bodies", action="store_true", help="floats inside functions too")
    parser.add_argument("--list", action="store_true", help="list the numbers and their tests, run nothing")
    return parser.parse_args()


def main() -> int:
    chosen = arguments()
    roots = [ROOT / name for name in chosen.module or ["models"]]
    files = [path for root in roots for path in ([root] if root.is_file() else sorted(root.rglob("*")))]
    files = [path for path in files if path.suffix in (".py", ".json", ".csv")]
    every = [number for path in files for number in numbers(path, chosen.bodies)]
    kept = [number for number in every if physical(number)]
    if chosen.sample:
        draw = random.Random(1)
        by_file: dict[str, list[Number]] = defaultdict(list)
        for number in kept:
            by_file[number.path].append(number)
        kept = [n for some in by_file.values() for n in draw.sample(some, min(chosen.sample, len(some)))]
    left = sum(not physical(number) for number in every)
    names = sorted({number.name for number in every if not physical(number)})
    print(f"{len(kept)} numbers; {left} left out, whose names say method and not physics: {', '.join(names)}")
    if chosen.list:
        for number in kept:
            print(number.label, "<-", " ".join(tests_of(number.path)[0]) or "no test of its own")
        return 0
    results, refused = audit(kept, chosen.jobs, chosen.limit)
    print(table(results, refused))
    return 0 if all(results.values()) and not refused else 1


if __name__ == "__main__":
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    sys.exit(main())
