"""The rules of the house that a machine can check: each finding says file, line and rule."""

from __future__ import annotations

import ast
import re
import sys
from collections.abc import Iterable, Iterator

import pytest

from tests.house import PACKAGES, ROOT, Finding, Function, Rule, Source, offences, planted, sources, tracked

# --- arrows -------------------------------------------------------------------------------------

FOUNDATION = {"constants", "units", "errors", "arrays", "components", "saturation", "estimate"}
MASS = {"instruments", "columns", "mass", "space", "expected"}
MODEL_ARROWS = {
    **dict.fromkeys(FOUNDATION, FOUNDATION),
    "geometry": FOUNDATION | {"geometry"},
    "liquid": FOUNDATION | {"liquid"},
    "vapour": FOUNDATION | {"vapour"},
    **dict.fromkeys(MASS, FOUNDATION | {"geometry", "liquid", "vapour"} | MASS),
    "balance": FOUNDATION | {"mass", "balance"},
}
# Arithmetic needs containers, types and its own data files; a clock, the environment, a log, a
# network or a database would make a model fail for reasons other than physics.
STDLIB_OF_MODELS = {
    "__future__", "abc", "bisect", "collections", "contextlib", "csv", "dataclasses", "decimal", "enum",
    "fractions", "functools", "importlib.resources", "io", "itertools", "json", "math", "operator", "re",
    "string", "types", "typing", "warnings",
}  # fmt: skip

# What a room of app/ may import of the project. The store's handle is passed through the rooms
# above services, which alone open it; main, cli and worker put the parts together.
WIRE = {"app.errors", "app.settings", "app.clock", "app.edge", "app.schemas", "app.services"}
HANDLE = "app.store.engine.Store"
APP_ARROWS = {
    "settings": set(),
    "errors": set(),
    "clock": set(),
    "schemas": {"app.schemas"},
    "store": {"app.store", "app.clock"},
    "services": {"app.services", "app.store", "app.schemas", "app.errors", "app.settings", "app.clock",
                 "models"},
    "edge": {"app.edge", "app.errors", "app.settings", "app.clock", "app.store.engine.StoreUnavailable",
             "app.store.engine.DiskFull"},
    "api": WIRE | {"app.api", HANDLE},
    "pages": WIRE | {"app.pages", HANDLE},
    "main": {"app.api", "app.pages", "app.edge", "app.errors", "app.settings", "app.clock",
             "app.store.engine", "models.errors.ModelError"},
    "cli": {"app.main", "app.services", "app.schemas", "app.errors", "app.settings", "app.clock",
            "app.store.engine", "demo_data"},
    "worker": {"app.services", "app.errors", "app.settings", "app.clock", "app.store.engine"},
}  # fmt: skip
LIBRARIES = {
    "settings": {"pydantic", "pydantic_settings"},
    "errors": {"pydantic"},  # turns what pydantic refused into named fields
    "clock": set(),
    "schemas": {"pydantic", "pydantic_core", "annotated_types", "typing_extensions"},
    "store": {"sqlalchemy", "alembic", "psycopg"},
    "services": {"numpy", "pydantic", "pint", "sqlalchemy.Connection"},  # passed on; SQL stands in store
    "edge": {"fastapi", "starlette", "pydantic", "pydantic_core", "uvicorn"},
    "api": {"fastapi", "starlette", "pydantic"},
    "pages": {"fastapi", "starlette"},
    "main": {"fastapi", "starlette"},
    "cli": {"click", "uvicorn", "httpx"},
    "worker": {"click"},
}


def within(name: str, allowed: Iterable[str]) -> bool:
    return any(name == root or name.startswith(root + ".") for root in allowed)


def models_know_only_arithmetic(source: Source) -> Iterator[Finding]:
    if source.package != "models" or source.parts == ("models",):
        return
    room = source.parts[1]
    if room not in MODEL_ARROWS:
        yield 1, f"models/{room} has no place in the arrows of models/"
        return
    for line, name in source.imports():
        root = name.split(".")[0]
        if root == "models":
            if not within(name, (f"models.{other}" for other in MODEL_ARROWS[room])):
                yield line, f"arrow: models/{room} may not import {name}"
        elif root not in ("numpy", "scipy") and not within(name, STDLIB_OF_MODELS):
            yield line, f"arrow: models know numpy, scipy and themselves, not {name}"
    for call, called in source.calls():
        if isinstance(call.func, ast.Name) and called in (
            "print",
            "input",
            "open",
            "exec",
            "eval",
            "__import__",
        ):
            yield call.lineno, f"models are pure: no {called}()"


def app_follows_the_arrows(source: Source) -> Iterator[Finding]:
    if source.package != "app" or source.parts == ("app",):
        return
    room = source.parts[1]
    if room not in APP_ARROWS:
        yield 1, f"app/{room} has no place in the arrows of app/"
        return
    for line, name in source.imports():
        root = name.split(".")[0]
        if root in (*PACKAGES, "tests"):
            if not within(name, APP_ARROWS[room]):
                yield line, f"arrow: app/{room} may not import {name}"
        elif root not in sys.stdlib_module_names and not within(name, LIBRARIES[room]):
            yield line, f"arrow: app/{room} may not know {name}"


def migrations_stand_alone(source: Source) -> Iterator[Finding]:
    if source.parts[:2] != ("migrations", "versions"):
        return
    for line, name in source.imports():
        if name.split(".")[0] in (*PACKAGES, "tests"):
            yield line, f"a migration stands alone: it may not import {name}, which changes after it"


def nothing_reads_the_tests(source: Source) -> Iterator[Finding]:
    if source.package in PACKAGES:
        for line, name in source.imports():
            if name.split(".")[0] == "tests":
                yield line, f"{source.package}/ may not import {name}"


# --- shape --------------------------------------------------------------------------------------

FILE_LINES = 500
BODY_LINES = 70
HANDLER_LINES = 12
EMPTY_NAMES = {
    "util",
    "utils",
    "helper",
    "helpers",
    "common",
    "base",
    "misc",
    "miscellaneous",
    "shared",
    "stuff",
}
METHODS = {"get", "put", "post", "delete", "patch", "head", "options", "api_route", "route"}


def body_lines(function: Function) -> int:
    """Lines from the first statement after the docstring to the last, blank and comment lines too."""
    body = function.body[1:] if ast.get_docstring(function, clean=False) is not None else function.body
    return (body[-1].end_lineno or 0) - body[0].lineno + 1 if body else 0


def files_are_short(source: Source) -> Iterator[Finding]:
    lines = len(source.text.splitlines())
    if lines >= FILE_LINES:
        yield FILE_LINES, f"{lines} lines; a file stays under {FILE_LINES}"


def functions_are_short(source: Source) -> Iterator[Finding]:
    for function in source.functions():
        if body_lines(function) >= BODY_LINES:
            yield function.lineno, f"{function.name}: {body_lines(function)} body lines; under {BODY_LINES}"


def handlers_are_a_few_lines(source: Source) -> Iterator[Finding]:
    if source.parts[:2] != ("app", "api"):
        return
    for function in source.functions():
        routed = any(
            isinstance(mark, ast.Call) and isinstance(mark.func, ast.Attribute) and mark.func.attr in METHODS
            for mark in function.decorator_list
        )
        if routed and body_lines(function) >= HANDLER_LINES:
            yield (
                function.lineno,
                f"{function.name}: {body_lines(function)} body lines; under {HANDLER_LINES}",
            )


def names_say_something(source: Source) -> Iterator[Finding]:
    for part in source.path.removesuffix(".py").split("/"):
        stem = part.removeprefix("test_")
        if stem in EMPTY_NAMES or stem.rsplit("_", 1)[-1] in EMPTY_NAMES - {"base", "shared"}:
            yield 1, f"the name {part} says nothing of what is inside"


# --- storage ------------------------------------------------------------------------------------

ENGINE = "app/store/engine.py"
MUTABLE = ("app/store/due.py", "app/store/keys.py")
CHANGING_SQL = re.compile(r"\bUPDATE\s+\S+\s+SET\b|\bDELETE\s+FROM\b|\bDO\s+UPDATE\b", re.IGNORECASE)
TRANSACTION_SQL = re.compile(
    r"\s*(BEGIN|COMMIT|ROLLBACK|SAVEPOINT)\b(\s+(IMMEDIATE|EXCLUSIVE|TRANSACTION|WORK))?\s*;?\s*"
)
TRANSACTION_CALLS = {
    "commit",
    "begin",
    "begin_nested",
    "begin_twophase",
    "rollback",
    "connect",
    "create_engine",
}


def only_the_engine_commits(source: Source) -> Iterator[Finding]:
    if source.package not in ("app", "demo_data"):
        return
    for node in ast.walk(source.tree):
        for item in node.items if isinstance(node, ast.With | ast.AsyncWith) else ():
            call = item.context_expr
            if (
                isinstance(call, ast.Call)
                and isinstance(call.func, ast.Attribute)
                and call.func.attr == "begin"
            ):
                yield call.lineno, "`with ….begin()` commits without saying so"
    if source.path == ENGINE:
        commits = [call.lineno for call, called in source.calls() if called == "commit"]
        yield from ((line, "a second commit: one request is one transaction") for line in commits[1:])
        return
    for call, called in source.calls():
        if called in TRANSACTION_CALLS:
            yield call.lineno, f"{called}() stands in {ENGINE} only"
    for line, text in source.strings():
        if TRANSACTION_SQL.fullmatch(text):
            yield line, f"{text.strip()} stands in {ENGINE} only"


def only_services_open_the_store(source: Source) -> Iterator[Finding]:
    if source.package != "app" or source.parts[1:2] == ("services",) or source.path == ENGINE:
        return
    for call, called in source.calls():
        if isinstance(call.func, ast.Attribute) and called in ("reading", "writing"):
            yield call.lineno, f"{called}() opens the store: services do that"


def sql_stands_in_the_store(source: Source) -> Iterator[Finding]:
    if source.package not in ("app", "demo_data") or source.parts[1:2] == ("store",):
        return
    for call, called in source.calls():
        if called in ("execute", "executemany", "exec_driver_sql", "scalar", "scalars"):
            yield call.lineno, f"{called}(): SQL stands in app/store only"


def rows_are_never_changed(source: Source) -> Iterator[Finding]:
    if source.package not in ("app", "demo_data") or source.path in MUTABLE:
        return
    imported = {name for _, name in source.imports() if name.startswith("sqlalchemy")}
    bare = {name.rsplit(".", 1)[1] for name in imported if name.endswith((".update", ".delete"))}
    where = "append-only: UPDATE and DELETE stand in store/due.py and store/keys.py only"
    for call, called in source.calls():
        if called == "on_conflict_do_update":
            yield call.lineno, where
        elif called in ("update", "delete"):
            if isinstance(call.func, ast.Name):
                guilty = called in bare
            else:  # a table's own method takes no argument, `sa.update` takes the table
                owner = call.func.value if isinstance(call.func, ast.Attribute) else None
                library = isinstance(owner, ast.Name) and owner.id in ("sa", "sqlalchemy")
                guilty = library or not (call.args or call.keywords)
            if guilty:
                yield call.lineno, where
    for line, text in source.strings():
        if CHANGING_SQL.search(text):
            yield line, where


# --- words and places ---------------------------------------------------------------------------

TOP_LEVEL = {
    "README.md",
    "DEVELOPERS.md",
    "pyproject.toml",
    "app",
    "models",
    "migrations",
    "tests",
    "demo_data",
}
# In pieces, so that this file does not offend: what tells of how the text came about instead of
# what it says, and folders of one machine.
TELLING = ("trans" + "cript", "lec" + "ture", "seed " + "document", "this " + "session", "sub" + "agent")
FOLDERS = ("farm", "work", "root", "home", "tmp", "Users")
UNWANTED = re.compile("|".join(TELLING), re.IGNORECASE)
MACHINE = re.compile(
    r"\.\./" + "shared" + r"|(?<![\w.])/(?:" + "|".join(FOLDERS) + r")/|\.py" + r"env/|\b[A-Z]:\\+" + "Users"
)
# Modules whose functions are tested elsewhere, each with its reason.
TESTED_ELSEWHERE: dict[str, str] = {}


def has_functions(source: Source) -> bool:
    return any(True for _ in source.functions())


def mirror_of(path: str) -> str:
    folder, _, name = path.rpartition("/")
    return f"tests/{folder}/test_{name}" if name != "__init__.py" else f"tests/{folder}/test_init.py"


def words(names: Iterable[str]) -> Iterator[str]:
    for name in names:
        try:
            text = (ROOT / name).read_text(encoding="utf-8")
        except UnicodeDecodeError:
            continue
        yield from strays(name, text)


def strays(name: str, text: str) -> Iterator[str]:
    for number, line in enumerate([name, *text.splitlines()]):
        for what, pattern in (("a word", UNWANTED), ("a folder of one machine", MACHINE)):
            if found := pattern.search(line):
                yield f"{name}:{number}: {what} that must not stand in the project: {found[0]}"


def listed(findings: Iterable[str]) -> str:
    return "".join(f"\n{finding}" for finding in findings)


RULES: tuple[Rule, ...] = (
    models_know_only_arithmetic,
    app_follows_the_arrows,
    migrations_stand_alone,
    nothing_reads_the_tests,
    files_are_short,
    functions_are_short,
    handlers_are_a_few_lines,
    names_say_something,
    only_the_engine_commits,
    only_services_open_the_store,
    sql_stands_in_the_store,
    rows_are_never_changed,
)


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.__name__)
def test_the_tree_keeps(rule: Rule) -> None:
    found = offences(rule, sources())
    assert not found, listed(found)


def test_the_tree_is_seen() -> None:
    seen = {source.package for source in sources()}
    assert seen >= {*PACKAGES, "tests"} and len(sources()) > 20


def test_top_level_holds_nothing_else() -> None:
    top = {name.split("/")[0] for name in tracked()}
    extra = sorted(name for name in top if not name.startswith(".") and name not in TOP_LEVEL)
    assert not extra, f"top-level names beyond the agreed ones: {extra}"


def test_no_word_tells_how_the_text_came_about() -> None:
    found = list(words(tracked()))
    assert not found, listed(found)


def test_tests_mirror_the_tree() -> None:
    there = set(tracked())
    code = [source for source in sources() if source.package in ("app", "models") and has_functions(source)]
    missing = [
        f"{source.path}:1: its tests stand in {mirror_of(source.path)}, which does not exist"
        for source in code
        if mirror_of(source.path) not in there and source.path not in TESTED_ELSEWHERE
    ]
    assert not missing, listed(missing)
    stale = sorted(set(TESTED_ELSEWHERE) - {source.path for source in code})
    assert not stale, f"exempt and gone: {stale}"


def test_tests_are_no_package() -> None:
    packages = [name for name in tracked() if name.startswith("tests/") and name.endswith("__init__.py")]
    assert not packages, f"tests are collected by importlib and need no package: {packages}"


def test_the_only_commit_is_there() -> None:
    engine = [source for source in sources() if source.path == ENGINE]
    assert engine, f"{ENGINE} does not exist"
    commits = [call for call, called in engine[0].calls() if called == "commit"]
    assert len(commits) == 1, f"{ENGINE}: {len(commits)} commits, expected the only one of the project"


LONG = "def f():\n" + "    x = 1\n"
HANDLER = '@router.get("/")\ndef f():\n    """Doc.\n\n    More.\n    """\n'

OFFENCES: tuple[tuple[Rule, str, str], ...] = (
    (models_know_only_arithmetic, "models/liquid/x.py", "from models.geometry import curves\n"),
    (models_know_only_arithmetic, "models/liquid/x.py", "from ..vapour.root import solve\n"),
    (models_know_only_arithmetic, "models/units.py", "import models.mass\n"),
    (models_know_only_arithmetic, "models/balance/x.py", "from models.geometry.curves import Curve\n"),
    (models_know_only_arithmetic, "models/mass.py", "def f():\n    import time\n"),
    (models_know_only_arithmetic, "models/mass.py", "from app import clock\n"),
    (models_know_only_arithmetic, "models/mass.py", "print(1)\n"),
    (models_know_only_arithmetic, "models/tank.py", ""),
    (app_follows_the_arrows, "app/api/x.py", "from app.store import readings\n"),
    (app_follows_the_arrows, "app/api/x.py", "from models import units\n"),
    (app_follows_the_arrows, "app/store/x.py", "from models.units import kelvin\n"),
    (app_follows_the_arrows, "app/schemas/x.py", "import numpy as np\n"),
    (app_follows_the_arrows, "app/services/x.py", "from app.api.vessels import router\n"),
    (app_follows_the_arrows, "app/services/x.py", "from sqlalchemy import select\n"),
    (app_follows_the_arrows, "app/errors.py", "from fastapi import Request\n"),
    (app_follows_the_arrows, "app/odds.py", ""),
    (migrations_stand_alone, "migrations/versions/one.py", "from app.store.tables import METADATA\n"),
    (nothing_reads_the_tests, "demo_data/make.py", "from tests.house import ROOT\n"),
    (files_are_short, "app/x.py", "\n" * 500),
    (functions_are_short, "app/x.py", LONG + "    x = 1\n" * 69),
    (handlers_are_a_few_lines, "app/api/x.py", HANDLER + "    x = 1\n" * 12),
    (names_say_something, "app/helpers.py", ""),
    (names_say_something, "models/common/x.py", ""),
    (names_say_something, "tests/app/test_time_utils.py", ""),
    (only_the_engine_commits, "app/services/x.py", "connection.commit()\n"),
    (only_the_engine_commits, "app/store/x.py", "with engine.begin() as c:\n    pass\n"),
    (only_the_engine_commits, "app/store/x.py", "c.exec_driver_sql('COMMIT')\n"),
    (only_the_engine_commits, ENGINE, "def f(c):\n    c.commit()\n    c.commit()\n"),
    (only_services_open_the_store, "app/api/x.py", "with store.writing('s'):\n    pass\n"),
    (sql_stands_in_the_store, "app/services/x.py", "connection.execute(q)\n"),
    (rows_are_never_changed, "app/store/x.py", "from sqlalchemy import update\nupdate(t)\n"),
    (rows_are_never_changed, "app/store/x.py", "import sqlalchemy as sa\nsa.delete(t)\n"),
    (rows_are_never_changed, "app/store/x.py", "t.delete().where(t.c.a == 1)\n"),
    (rows_are_never_changed, "app/store/x.py", "s = 'update readings set value = 1'\n"),
    (rows_are_never_changed, "app/store/x.py", "s = f'INSERT {x} ON CONFLICT DO UPDATE SET a = 1'\n"),
)
INNOCENT: tuple[tuple[Rule, str, str], ...] = (
    (
        models_know_only_arithmetic,
        "models/vapour/x.py",
        "import math\nfrom models import units\n",
    ),
    (
        models_know_only_arithmetic,
        "models/balance/x.py",
        "import scipy.sparse\nfrom models import mass\n",
    ),
    (
        app_follows_the_arrows,
        "app/api/x.py",
        "import fastapi\nfrom app.store.engine import Store\n",
    ),
    (app_follows_the_arrows, "app/services/x.py", "import numpy\nfrom models.geometry import curves\n"),
    (migrations_stand_alone, "migrations/env.py", "from app.store.tables import METADATA\n"),
    (files_are_short, "app/x.py", "\n" * 499),
    (functions_are_short, "app/x.py", LONG + "    x = 1\n" * 68),
    (handlers_are_a_few_lines, "app/api/x.py", HANDLER + "    x = 1\n" * 11),
    (names_say_something, "app/store/database.py", ""),
    (only_the_engine_commits, ENGINE, "def f(c):\n    c.begin()\n    c.commit()\n"),
    (only_services_open_the_store, "app/services/x.py", "with store.writing('s'):\n    pass\n"),
    (app_follows_the_arrows, "app/services/x.py", "from sqlalchemy import Connection\n"),
    (sql_stands_in_the_store, "app/store/x.py", "connection.execute(q)\n"),
    (rows_are_never_changed, "app/store/x.py", "found.update(other)\nclient.delete('/x')\n"),
    (rows_are_never_changed, "app/store/due.py", "from sqlalchemy import update\nupdate(t)\n"),
)


@pytest.mark.parametrize(("rule", "path", "text"), OFFENCES)
def test_an_offence_is_found(rule: Rule, path: str, text: str) -> None:
    assert planted(rule, path, text)


@pytest.mark.parametrize(("rule", "path", "text"), INNOCENT)
def test_a_look_alike_passes(rule: Rule, path: str, text: str) -> None:
    assert planted(rule, path, text) == []


def test_every_rule_is_held_against_an_offence() -> None:
    assert {rule for rule, _, _ in OFFENCES} == set(RULES)


@pytest.mark.parametrize(
    "text", ["a lec" + "ture says", "see ../" + "shared/x", "in /ro" + "ot/x", "`/t" + "mp/x`"]
)
def test_a_stray_word_is_found(text: str) -> None:
    assert [finding.split(":")[:2] for finding in strays("README.md", f"\n{text}\n")] == [["README.md", "2"]]


@pytest.mark.parametrize(
    "text", ["/usr/lib/postgresql", "https://example.org/home/x", "a/wo" + "rk/b", "/v1/wo" + "rk"]
)
def test_other_paths_pass(text: str) -> None:
    assert list(strays("README.md", text)) == []
