"""The rules of the house, checked on the source itself."""

import ast
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
SOURCES = sorted((ROOT / "lbwork").rglob("*.py"))
TESTS = sorted((ROOT / "tests").rglob("test_*.py"))


def identifier(path):
    return str(path.relative_to(ROOT))


@pytest.mark.parametrize("path", SOURCES, ids=identifier)
def test_rooms_are_small(path):
    assert len(path.read_text(encoding="utf-8").splitlines()) <= 500


@pytest.mark.parametrize("path", SOURCES, ids=identifier)
def test_library_neither_prints_nor_asks_nor_asserts(path):
    tree = ast.parse(path.read_text(encoding="utf-8"))
    asserted = [node.lineno for node in ast.walk(tree) if isinstance(node, ast.Assert)]
    called = [
        node.lineno
        for node in ast.walk(tree)
        if isinstance(node, ast.Call)
        and isinstance(node.func, ast.Name)
        and node.func.id in ("print", "input", "eval", "exec")
    ]
    assert asserted == []
    assert called == []


@pytest.mark.parametrize("path", SOURCES, ids=identifier)
def test_exceptions_that_are_built_are_raised(path):
    tree = ast.parse(path.read_text(encoding="utf-8"))
    lonely = [
        node.lineno
        for node in ast.walk(tree)
        if isinstance(node, ast.Expr)
        and isinstance(node.value, ast.Call)
        and isinstance(node.value.func, ast.Name)
        and node.value.func.id.endswith(("Error", "Exception"))
    ]
    assert lonely == []


@pytest.mark.parametrize("path", SOURCES, ids=identifier)
def test_public_things_have_docstrings(path):
    tree = ast.parse(path.read_text(encoding="utf-8"))
    assert ast.get_docstring(tree), "module docstring"
    public = [
        node
        for node in tree.body
        if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("_")
    ]
    assert [node.name for node in public if not ast.get_docstring(node)] == []


@pytest.mark.parametrize("path", sorted((ROOT / "lbwork").rglob("__init__.py")), ids=identifier)
def test_packages_declare_their_public_names(path):
    tree = ast.parse(path.read_text(encoding="utf-8"))
    names = [
        target.id
        for node in tree.body
        if isinstance(node, ast.Assign | ast.AnnAssign)
        for target in ([node.target] if isinstance(node, ast.AnnAssign) else node.targets)
        if isinstance(target, ast.Name)
    ]
    assert "__all__" in names


def _checks_something(function):
    for node in ast.walk(function):
        if isinstance(node, ast.Assert | ast.Raise):
            return True
        if isinstance(node, ast.Call):
            name = ast.unparse(node.func).rpartition(".")[2]
            if name.startswith(("assert", "check", "raises", "expect")):
                return True
    return False


@pytest.mark.parametrize("path", TESTS, ids=identifier)
def test_every_test_can_fail(path):
    tree = ast.parse(path.read_text(encoding="utf-8"))
    tests = [
        node
        for node in ast.walk(tree)
        if isinstance(node, ast.FunctionDef) and node.name.startswith("test_")
    ]
    assert [test.name for test in tests if not _checks_something(test)] == []
