"""Templates of a community's own, held to what a page needs: they read what they are given, and nothing else.

They call functions of the site, methods of plain values, and macros. Files, modules and the inside of Python stay out
of reach; a page takes so many steps, a file is so large (``content/own.py``). What they write is theirs: any markup,
and script too. Memory is bounded by none of this: who writes a template can make the build fail.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from datetime import date, time, timedelta, tzinfo
from inspect import unwrap
from pathlib import PurePath
from types import BuiltinMethodType, FunctionType, MappingProxyType, ModuleType
from typing import Any

from jinja2 import TemplateError, TemplateSyntaxError, nodes
from jinja2.compiler import CodeGenerator
from jinja2.exceptions import SecurityError
from jinja2.runtime import Context
from jinja2.sandbox import ImmutableSandboxedEnvironment

MAX_STEPS = 500_000
"""Turns of loops and calls on one page; the longest of the theme, the site map, takes thirty a page of the site."""
MAX_LENGTH = 1_000_000
"""Of what is multiplied; and a power has at most so many bits."""

_PLAIN = (str, bytes, int, float, list, tuple, dict, set, frozenset, MappingProxyType, date, time, timedelta, tzinfo)


class _Counting(CodeGenerator):
    def visit_Template(self, node: nodes.Template, frame: Any = None) -> None:  # noqa: N802
        for loop in list(node.find_all(nodes.For)):
            counted = nodes.EnvironmentAttribute("counted", lineno=loop.lineno)
            loop.iter = nodes.Call(counted, [loop.iter], [], None, None, lineno=loop.lineno)
        super().visit_Template(node, frame)


class Sandbox(ImmutableSandboxedEnvironment):
    """``steps`` is set to 0 before each page."""

    code_generator_class = _Counting
    intercepted_binops = frozenset({"*", "**"})

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self.steps = 0

    def compile(self, source: Any, name: str | None = None, filename: str | None = None, *args: Any) -> Any:
        """What is nested too deeply for Python to compile is a fault of the template like any other."""
        try:
            return super().compile(source, name, filename, *args)
        except TemplateError as fault:
            if isinstance(fault, TemplateSyntaxError) and fault.filename is None:  # the lexer does not say
                fault.filename = filename
            raise
        except Exception as fault:
            raise TemplateSyntaxError(f"it cannot be compiled: {fault}", 1, name, filename) from fault

    def is_safe_attribute(self, obj: Any, attr: str, value: Any) -> bool:
        if isinstance(obj, PurePath):
            return False
        if isinstance(obj, ModuleType):
            return attr.isupper() or (isinstance(value, FunctionType) and value.__module__ == obj.__name__)
        return super().is_safe_attribute(obj, attr, value)

    def is_safe_callable(self, obj: Any) -> bool:
        obj = unwrap(obj)
        if isinstance(obj, BuiltinMethodType):
            return isinstance(obj.__self__, _PLAIN)
        maker = obj.__module__ if isinstance(getattr(obj, "__module__", None), str) else type(obj).__module__
        ours = maker.partition(".")[0] == "moonwrit" and not isinstance(obj, type)
        return super().is_safe_callable(obj) and (ours or obj is dict or maker.startswith(("jinja2.", "markupsafe")))

    def call(self, context: Context, obj: Callable[..., Any], *args: Any, **kwargs: Any) -> Any:
        self._step()
        return super().call(context, obj, *args, **kwargs)

    def counted(self, items: Iterable[Any]) -> Iterator[Any]:
        """The items of a loop, each of which is a step."""
        for item in items:
            self._step()
            yield item

    def call_binop(self, context: Context, operator: str, left: Any, right: Any) -> Any:
        numbers = isinstance(left, (int, float)) and isinstance(right, (int, float))
        if operator == "**" and numbers:
            large = isinstance(left, int) and isinstance(right, int) and left.bit_length() * right > MAX_LENGTH
        elif numbers:
            large = all(isinstance(one, int) and one.bit_length() > MAX_LENGTH for one in (left, right))
        else:
            long = [len(one) for one in (left, right) if hasattr(one, "__len__")]
            times = [one for one in (left, right) if isinstance(one, int)]
            large = any(length * number > MAX_LENGTH for length in long for number in times)
        if large:
            raise SecurityError(f"the result of {operator} is too large")
        return super().call_binop(context, operator, left, right)

    def _step(self) -> None:
        self.steps += 1
        if self.steps > MAX_STEPS:
            raise SecurityError(f"loops and calls take more than {MAX_STEPS} steps on this page")


__all__ = ["MAX_LENGTH", "MAX_STEPS", "Sandbox"]
