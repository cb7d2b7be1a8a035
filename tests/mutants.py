"""Do the tests notice? One small change of a module at a time, in a copy, against the tests that mirror it.

``python tests/mutants.py generator/moonwrit/journal.py [how many] [tests ...]``: a random sample, the same each time.
Printed are the changes that no test noticed: a test is missing, or the change makes no difference, or the code is not
needed. A run that takes far longer than usual is counted apart.
"""

from __future__ import annotations

import ast
import os
import random
import shutil
import subprocess
import sys
import time
from collections import Counter
from collections.abc import Iterator
from pathlib import Path
from tempfile import TemporaryDirectory

ROOT = Path(__file__).resolve().parent.parent
_COMPARED: dict[type[ast.cmpop], type[ast.cmpop]] = {
    ast.Lt: ast.LtE, ast.LtE: ast.Lt, ast.Gt: ast.GtE, ast.GtE: ast.Gt, ast.Eq: ast.NotEq, ast.NotEq: ast.Eq,
    ast.Is: ast.IsNot, ast.IsNot: ast.Is, ast.In: ast.NotIn, ast.NotIn: ast.In,
}
_JOINED: dict[type[ast.operator], type[ast.operator]] = {
    ast.Add: ast.Sub, ast.Sub: ast.Add, ast.Mult: ast.Add, ast.Div: ast.Mult, ast.Mod: ast.Mult, ast.FloorDiv: ast.Mult,
}
_NAMED = {"min": "max", "max": "min", "any": "all", "all": "any", "minimum": "maximum", "maximum": "minimum"}


def changes(tree: ast.AST) -> Iterator[tuple[ast.expr | ast.stmt, str, object]]:
    """Every change, as a node, its field, and what that becomes; in an order that lasts."""
    aside: list[ast.AST | None] = []  # what says nothing of what is done: annotations, decorators, messages of errors
    for node in ast.walk(tree):
        match node:
            case ast.AnnAssign() | ast.arg():
                aside.append(node.annotation)
            case ast.FunctionDef() | ast.ClassDef():
                aside += [getattr(node, "returns", None), *node.decorator_list]
            case ast.Raise() | ast.Assert():
                aside.append(node)
    untouched = {below for node in aside if node is not None for below in ast.walk(node)}
    for node in ast.walk(tree):
        if node in untouched:
            continue
        match node:
            case ast.Compare(ops=ops):
                for at, sign in enumerate(ops):
                    yield node, "ops", [*ops[:at], _COMPARED[type(sign)](), *ops[at + 1:]]
            case ast.BinOp(op=sign) | ast.AugAssign(op=sign) if type(sign) in _JOINED:
                yield node, "op", _JOINED[type(sign)]()
            case ast.BoolOp(op=either):
                yield node, "op", ast.And() if isinstance(either, ast.Or) else ast.Or()
            case ast.Constant(value=bool(value)):
                yield node, "value", not value
            case ast.Constant(value=int(value) | float(value)):
                yield node, "value", value + 1
            case ast.If(test=test) | ast.IfExp(test=test) | ast.While(test=test):
                yield node, "test", ast.UnaryOp(ast.Not(), test)
            case ast.Call(func=(ast.Name(id=name) | ast.Attribute(attr=name)) as called) if name in _NAMED:
                yield called, "id" if isinstance(called, ast.Name) else "attr", _NAMED[name]
            case ast.Expr(value=ast.Call()):
                yield node, "value", ast.Constant(None)


def main(file: str, sample: int, tests: list[str]) -> None:
    source = (ROOT / file).read_text(encoding="utf-8")
    count = len(list(changes(ast.parse(source))))
    ends: Counter[str] = Counter()
    with TemporaryDirectory() as folder:
        copy = Path(folder)
        for name in ("generator", "tests", "themes", "content"):
            shutil.copytree(ROOT / name, copy / name, ignore=shutil.ignore_patterns("__pycache__"))
        shutil.copy(ROOT / "pyproject.toml", copy)
        command = [sys.executable, "-B", "-m", "pytest", "-x", "-q", "-p", "no:cacheprovider", *tests]
        environment = {**os.environ, "PYTHONPATH": str(copy / "generator")}
        begun = time.monotonic()
        subprocess.run(command, cwd=copy, env=environment, check=True, stdout=subprocess.DEVNULL)
        limit = 30 + 5 * (time.monotonic() - begun)
        for number in random.Random(1).sample(range(count), min(sample, count)):
            tree = ast.parse(source)
            node, field, new = list(changes(tree))[number]
            was = ast.unparse(node).partition("\n")[0]
            setattr(node, field, new)
            (copy / file).write_text(ast.unparse(ast.fix_missing_locations(tree)), encoding="utf-8")
            try:
                done = subprocess.run(command, cwd=copy, env=environment, timeout=limit, capture_output=True)
                end = "noticed" if done.returncode else "not noticed"
            except subprocess.TimeoutExpired:
                end = "too long"
            ends[end] += 1
            if end != "noticed":
                now = ast.unparse(node).partition("\n")[0]
                print(f"{file}:{node.lineno}: {was} -> {now}: {end}", flush=True)
    print(f"{file}: {count} changes, {ends.total()} tried: {dict(ends)}")


if __name__ == "__main__":
    mirrored = Path(sys.argv[1]).relative_to("generator/moonwrit")
    alone = [str(each.relative_to(ROOT)) for each in sorted(ROOT.glob(f"tests/test_{mirrored.stem}*.py"))]
    there = [f"tests/{mirrored.parent}"] if mirrored.parent.name else alone
    main(sys.argv[1], int(sys.argv[2]) if len(sys.argv) > 2 else 50, sys.argv[3:] or there)
