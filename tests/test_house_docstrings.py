"""Every public function of the models says its units, its formula and where the formula stands."""

from __future__ import annotations

import ast
import re
from collections.abc import Iterable, Iterator

import pytest

from tests.house import Finding, Function, Rule, Source, offences, planted, sources

UNIT = re.compile(r"\[[^\[\]]+\]\.?$")
EQUATION = re.compile(r"^\s+.*\S\s{2,}\((\d+[a-z]?)\)$")
ECHO = re.compile(r"\beqs?\.\s*(\d+[a-z]?(?:(?:\s*,\s*|\s+and\s+|\s+to\s+|\s*[-–]\s*)\d+[a-z]?)*)")


def sections(docstring: str) -> dict[str, list[str]]:
    """Lines of a cleaned docstring by the heading that is underlined with dashes; the first is ''."""
    found: dict[str, list[str]] = {"": []}
    lines = docstring.splitlines()
    heading = ""
    for line, following in zip(lines, [*lines[1:], ""], strict=True):
        if line.strip() and re.fullmatch(r"-{3,}", following):
            heading = line.strip()
            found[heading] = []
        elif not re.fullmatch(r"-{3,}", line):
            found[heading].append(line)
    return found


def entries(lines: Iterable[str]) -> list[tuple[str, str]]:
    """Head and joined description of each entry of a numpydoc section."""
    found: list[tuple[str, str]] = []
    for line in lines:
        if line and not line[0].isspace():
            found.append((line.strip(), ""))
        elif line.strip() and found:
            found[-1] = (found[-1][0], f"{found[-1][1]} {line.strip()}".strip())
    return found


def names_of(head: str) -> list[str]:
    return [name.strip().lstrip("*") for name in head.split(" :")[0].split(",")]


def parameters(function: Function) -> list[str]:
    given = function.args
    named = [*given.posonlyargs, *given.args, *([given.vararg] if given.vararg else []), *given.kwonlyargs]
    named += [given.kwarg] if given.kwarg else []
    return [argument.arg for argument in named if argument.arg not in ("self", "cls")]


def marks(function: Function) -> set[str]:
    """Last names of the decorators."""
    return {ast.unparse(mark).split("(")[0].rsplit(".", 1)[-1] for mark in function.decorator_list}


def public_functions(source: Source) -> Iterator[Function]:
    """Public functions of the module and public methods of its public classes."""
    for node in source.tree.body:
        owners = node.body if isinstance(node, ast.ClassDef) and not node.name.startswith("_") else [node]
        for owner in owners:
            if (
                isinstance(owner, Function)
                and not owner.name.startswith("_")
                and "overload" not in marks(owner)
            ):
                yield owner


def every_quantity_has_a_unit(source: Source) -> Iterator[Finding]:
    if source.package != "models":
        return
    for function in public_functions(source):
        text = ast.get_docstring(function)
        if text is None:
            yield function.lineno, f"{function.name}: a public function of models/ has a numpydoc docstring"
            continue
        yield from ((function.lineno, f"{function.name}: {what}") for what in gaps(function, sections(text)))
    for node in source.tree.body:
        if isinstance(node, ast.ClassDef) and not node.name.startswith("_"):
            yield from undocumented_fields(source, node)


def gaps(function: Function, found: dict[str, list[str]]) -> Iterator[str]:
    """What the docstring of a function leaves unsaid."""
    if marks(function) & {"property", "cached_property"}:
        if not UNIT.search("\n".join(found[""]).strip()) and not found.get("Returns"):
            yield "a property's summary ends with its [unit]"
        return
    listed = entries([*found.get("Parameters", []), *found.get("Other Parameters", [])])
    told = [name for head, _ in listed for name in names_of(head)]
    yield from (f"parameter {name} is not documented" for name in parameters(function) if name not in told)
    yield from (f"{name} is documented, not a parameter" for name in told if name not in parameters(function))
    yield from (
        f"{head.split(' :')[0]} ends without a [unit]" for head, said in listed if not UNIT.search(said)
    )
    if function.returns is not None and ast.unparse(function.returns) in ("None", "NoReturn", "Never"):
        return
    returned = entries([*found.get("Returns", []), *found.get("Yields", [])])
    if not returned:
        yield "no Returns section"
    yield from (
        f"return value {head} ends without a [unit]" for head, said in returned if not UNIT.search(said)
    )


def undocumented_fields(source: Source, node: ast.ClassDef) -> Iterator[Finding]:
    """Fields of a dataclass without a unit in its docstring or in a comment on their line."""
    if not any("dataclass" in ast.unparse(mark) for mark in node.decorator_list):
        return
    found = sections(ast.get_docstring(node) or "")
    listed = entries([*found.get("Parameters", []), *found.get("Attributes", [])])
    told = {name for head, said in listed if UNIT.search(said) for name in names_of(head)}
    commented = {line for line, comment in source.comments() if re.search(r"\[[^\[\]]+\]", comment)}
    for item in node.body:
        if isinstance(item, ast.AnnAssign) and isinstance(item.target, ast.Name):
            name = item.target.id
            private = name.startswith("_") or "ClassVar" in ast.unparse(item.annotation)
            if not private and name not in told and item.lineno not in commented:
                yield item.lineno, f"{node.name}.{name}: a field is documented and ends with its [unit]"


def docstrings(source: Source) -> Iterator[tuple[ast.Module | ast.ClassDef | Function, str]]:
    for node in ast.walk(source.tree):
        if isinstance(node, ast.Module | ast.ClassDef | Function):
            text = ast.get_docstring(node)
            if text is not None:
                yield node, text


def equations(text: str) -> list[str]:
    return [match[1] for line in text.splitlines() if (match := EQUATION.match(line))]


def echoes(comment: str) -> Iterator[str]:
    """Numbers that a comment echoes: ``eqs. 1, 3-5`` gives 1, 3, 4 and 5."""
    for match in ECHO.finditer(comment):
        for piece in re.split(r"\s*,\s*|\s+and\s+", match[1]):
            ends = re.split(r"\s+to\s+|\s*[-–]\s*", piece)
            if len(ends) == 2 and ends[0].isdigit() and ends[1].isdigit():
                yield from map(str, range(int(ends[0]), int(ends[1]) + 1))
            else:
                yield from ends


def extent(source: Source, node: ast.AST) -> range:
    """Lines of a function, a class or the whole module."""
    last = getattr(node, "end_lineno", None) or len(source.text.splitlines())
    return range(getattr(node, "lineno", 1), last + 1)


def every_equation_is_sourced_and_echoed(source: Source) -> Iterator[Finding]:
    """An equation is echoed in its own function, or in one that numbers no equation the same."""
    if source.package != "models":
        return
    echoed = [(line, number) for line, comment in source.comments() for number in echoes(comment)]
    owners = [(node, text, equations(text)) for node, text in docstrings(source)]
    for node, text, numbers in owners:
        here, name = extent(source, node), getattr(node, "name", "the module")
        if numbers and not "".join(sections(text).get("References", [])).strip():
            yield here.start, f"{name}: numbered equations need a References section"
        for number in numbers:
            others = [
                extent(source, other) for other, _, theirs in owners if other is not node and number in theirs
            ]
            taken = [lines for lines in others if not set(here) <= set(lines)]
            lines = [line for line, echo in echoed if echo == number]
            if not any(line in here or not any(line in other for other in taken) for line in lines):
                yield here.start, f"{name}: equation ({number}) is echoed by no `# eq. {number}`"
    numbered = {number for _, _, numbers in owners for number in numbers}
    for line, comment in source.comments():
        if re.match(r"eqs?\.", comment) and " of " not in comment:
            strangers = [number for number in echoes(comment) if number not in numbered]
            yield from ((line, f"`# eq. {number}` echoes no equation of this file") for number in strangers)


def formulas_are_numbered(source: Source) -> Iterator[Finding]:
    """A literal block of the Notes with an equals sign in it carries a number to echo."""
    if source.package != "models":
        return
    for node, text in docstrings(source):
        notes = "\n".join(sections(text).get("Notes", []))
        for block in re.findall(r"::\n\n((?:[ ]+\S.*(?:\n|$)|[ ]*\n)+)", notes):
            if re.search(r" [=≈] ", block) and not equations(block):
                yield (
                    getattr(node, "lineno", 1),
                    f"{getattr(node, 'name', 'the module')}: a formula without its (number)",
                )


RULES: tuple[Rule, ...] = (
    every_quantity_has_a_unit,
    every_equation_is_sourced_and_echoed,
    formulas_are_numbered,
)

GOOD = '''
def density(mass, volume, *, offset=0.0):
    """Density of a thing.

    Parameters
    ----------
    mass, volume : array_like, shape (...)
        What it weighs, [any] and
        what it fills. [kg, m³]
    offset : float
        Added at the end. [kg/m³]

    Returns
    -------
    FloatArray, shape (...)
        Mass over volume. [kg/m³]

    Notes
    -----
    As everybody knows::

        ρ = m / V        (1)

    References
    ----------
    .. [1] Archimedes, "On Floating Bodies".
    """
    return mass / volume + offset  # eq. 1
'''
FIELDS = '''
@dataclass(frozen=True)
class Thing:
    """A thing.

    Attributes
    ----------
    mass : float
        What it weighs. [kg]
    """

    mass: float
    volume: float  # what it fills [m3]

    @property
    def density(self) -> float:
        """Mass over volume. [kg/m³]"""
        return self.mass / self.volume
'''


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.__name__)
def test_the_models_keep(rule: Rule) -> None:
    found = offences(rule, sources())
    assert not found, "".join(f"\n{finding}" for finding in found)


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.__name__)
@pytest.mark.parametrize("text", [GOOD, FIELDS])
def test_a_whole_docstring_passes(rule: Rule, text: str) -> None:
    assert planted(rule, "models/x.py", text) == []


@pytest.mark.parametrize(
    ("rule", "old", "new"),
    [
        (every_quantity_has_a_unit, "fills. [kg, m³]", "fills."),
        (every_quantity_has_a_unit, "volume. [kg/m³]", "volume [kg/m³] or so."),
        (every_quantity_has_a_unit, "mass, volume :", "mass :"),
        (every_quantity_has_a_unit, "    offset :", "    offsets :"),
        (every_quantity_has_a_unit, "Returns\n    -------", "Remarks\n    -------"),
        (every_quantity_has_a_unit, '    """Density of a thing.', '    x = """Density of a thing.'),
        (every_equation_is_sourced_and_echoed, "# eq. 1", "# see above"),
        (every_equation_is_sourced_and_echoed, "# eq. 1", "# eqs. 1 and 2"),
        (every_equation_is_sourced_and_echoed, '.. [1] Archimedes, "On Floating Bodies".', ""),
        (formulas_are_numbered, "        (1)", ""),
    ],
)
def test_a_gap_is_found(rule: Rule, old: str, new: str) -> None:
    assert GOOD.count(old) == 1
    assert planted(rule, "models/x.py", GOOD.replace(old, new))


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("weighs. [kg]", "weighs."),
        ("what it fills [m3]", "what it fills"),
        ("over volume. [kg/m³]", "over volume."),
    ],
)
def test_a_field_without_a_unit_is_found(old: str, new: str) -> None:
    assert FIELDS.count(old) == 1
    assert planted(every_quantity_has_a_unit, "models/x.py", FIELDS.replace(old, new))


def test_an_echo_counts_ranges_and_lists() -> None:
    assert list(echoes("eqs. 1, 3-5 and 7a")) == ["1", "3", "4", "5", "7a"]


def test_an_equation_of_one_function_is_not_echoed_by_another() -> None:
    twice = GOOD + GOOD.replace("def density", "def other").replace("# eq. 1", "")
    assert planted(every_equation_is_sourced_and_echoed, "models/x.py", twice)


def test_a_private_function_may_echo_for_a_public_one() -> None:
    moved = GOOD.replace("mass / volume + offset  # eq. 1", "_ratio(mass, volume) + offset")
    helper = "\ndef _ratio(mass, volume):\n    return mass / volume  # eq. 1\n"
    assert planted(every_equation_is_sourced_and_echoed, "models/x.py", moved)
    assert planted(every_equation_is_sourced_and_echoed, "models/x.py", moved + helper) == []
