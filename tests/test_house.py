"""The rules of the house, checked on the source itself."""

import ast
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
SOURCES = sorted((ROOT / "lbwork").rglob("*.py"))
PACKAGES = [path for path in SOURCES if path.name == "__init__.py"]
TESTS = sorted((ROOT / "tests").rglob("test_*.py"))

MAX_LINES = 500
ASKING = {"print", "input", "eval", "exec", "breakpoint"}
PUTTING_OFF = {"skip", "skipif", "xfail", "importorskip"}


def identifier(path):
    return str(path.relative_to(ROOT))


def parsed(path):
    return ast.parse(path.read_text(encoding="utf-8"))


def called_names(tree):
    """Last words of everything called: ``raises`` for ``pytest.raises(...)``."""
    calls = [node for node in ast.walk(tree) if isinstance(node, ast.Call)]
    return {ast.unparse(call.func).rpartition(".")[2] for call in calls}


def documented(body, prefix=""):
    """Pairs (name, has a docstring) of public functions, classes and methods."""
    for node in body:
        if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("_"):
            yield prefix + node.name, ast.get_docstring(node) is not None
            if isinstance(node, ast.ClassDef):
                yield from documented(node.body, f"{node.name}.")


def checks_something(node, helpers, visited=frozenset()):
    """Whether running ``node`` can fail a test, itself or through a function of the same file."""
    for inner in ast.walk(node):
        if isinstance(inner, ast.Assert):
            return True
        if isinstance(inner, ast.Raise) and "AssertionError" in ast.unparse(inner):
            return True
    names = called_names(node)
    if any(name in ("raises", "warns") or name.startswith("assert_") for name in names):
        return True
    nearby = (names & helpers.keys()) - visited
    return any(checks_something(helpers[name], helpers, visited | nearby) for name in nearby)


@pytest.mark.parametrize("path", SOURCES, ids=identifier)
def test_rooms_are_small(path):
    assert len(path.read_text(encoding="utf-8").splitlines()) <= MAX_LINES


@pytest.mark.parametrize("path", SOURCES, ids=identifier)
def test_library_neither_prints_nor_asks_nor_asserts(path):
    tree = parsed(path)
    plain = {
        node.func.id
        for node in ast.walk(tree)
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name)
    }
    assert plain & ASKING == set()
    assert [node.lineno for node in ast.walk(tree) if isinstance(node, ast.Assert)] == []


@pytest.mark.parametrize("path", SOURCES, ids=identifier)
def test_exceptions_that_are_built_are_raised(path):
    lonely = [
        node.lineno
        for node in ast.walk(parsed(path))
        if isinstance(node, ast.Expr)
        and isinstance(node.value, ast.Call)
        and ast.unparse(node.value.func).endswith(("Error", "Exception", "Warning"))
    ]
    assert lonely == []


@pytest.mark.parametrize("path", SOURCES, ids=identifier)
def test_no_exception_is_swallowed(path):
    silent = [
        node.lineno
        for node in ast.walk(parsed(path))
        if isinstance(node, ast.ExceptHandler)
        and all(isinstance(step, ast.Pass) for step in node.body)
    ]
    assert silent == []


@pytest.mark.parametrize("path", SOURCES, ids=identifier)
def test_public_things_have_docstrings(path):
    tree = parsed(path)
    assert ast.get_docstring(tree), "module docstring"
    assert [name for name, present in documented(tree.body) if not present] == []


@pytest.mark.parametrize("path", PACKAGES, ids=identifier)
def test_packages_declare_their_public_names(path):
    assigned = [node for node in parsed(path).body if isinstance(node, ast.Assign | ast.AnnAssign)]
    targets = [
        ast.unparse(target)
        for node in assigned
        for target in (node.targets if isinstance(node, ast.Assign) else [node.target])
    ]
    assert "__all__" in targets


@pytest.mark.parametrize("path", TESTS, ids=identifier)
def test_every_test_can_fail(path):
    tree = parsed(path)
    functions = {node.name: node for node in ast.walk(tree) if isinstance(node, ast.FunctionDef)}
    tests = [node for name, node in functions.items() if name.startswith("test_")]
    assert tests, "no test in a test file"
    assert [test.name for test in tests if not checks_something(test, functions)] == []


@pytest.mark.parametrize("path", TESTS, ids=identifier)
def test_no_test_is_put_off(path):
    words = {node.attr for node in ast.walk(parsed(path)) if isinstance(node, ast.Attribute)}
    assert words & PUTTING_OFF == set()
