"""Every public function of the kernel says what it takes and gives, and in which unit."""

from __future__ import annotations

import importlib
import inspect
import pkgutil
import re
from collections.abc import Callable, Iterator
from types import ModuleType
from typing import Any

import pytest

import meterlens.electrical

UNIT_WORDS = re.compile(
    r"\b(V|A|W|VA|kW|kvar|kVA|var|ohm|rad|radians?|degrees?|Hz|h|hours?|minutes?|s|seconds?|"
    r"fractions?|dimensionless|percent|per unit|SI units|unit of|kWh|kvarh)\b|[+-]1\b|0 to 1|tan φ"
)


def modules() -> Iterator[ModuleType]:
    for found in pkgutil.iter_modules(meterlens.electrical.__path__):
        yield importlib.import_module(f"meterlens.electrical.{found.name}")


def public_functions() -> list[Any]:
    return [
        pytest.param(getattr(module, name), id=f"{module.__name__.rpartition('.')[2]}.{name}")
        for module in modules()
        for name in module.__all__
        if inspect.isfunction(getattr(module, name))
    ]


def sections(function: Callable[..., Any]) -> dict[str, str]:
    text = inspect.getdoc(function) or ""
    parts = re.split(r"^([A-Z][A-Za-z ]+)\n-{3,}$", text, flags=re.MULTILINE)
    return {"": parts[0]} | dict(zip(parts[1::2], parts[2::2], strict=True))


@pytest.mark.parametrize("function", public_functions())
def test_docstring(function: Callable[..., Any]) -> None:
    found = sections(function)
    assert found[""].strip(), "no summary"
    assert "Returns" in found
    parameters = inspect.signature(function).parameters
    if parameters:
        names = re.findall(r"^([a-z_0-9, ]+) : ", found["Parameters"], flags=re.MULTILINE)
        assert [n for line in names for n in line.split(", ")] == list(parameters)
    assert UNIT_WORDS.search(found.get("Parameters", "") + found["Returns"]), "no unit"
    if re.search(r"^\s+raise ", inspect.getsource(function), flags=re.MULTILINE):
        assert "Raises" in found


def test_every_module_says_what_is_public() -> None:
    for module in modules():
        assert module.__doc__, module.__name__
        own = {
            name
            for name, thing in vars(module).items()
            if not name.startswith("_")
            and (inspect.isfunction(thing) or inspect.isclass(thing))
            and thing.__module__ == module.__name__
        }
        assert set(module.__all__) >= {n for n in own if inspect.isfunction(getattr(module, n))}
        assert all(hasattr(module, name) for name in module.__all__)


def test_public_classes_describe_their_attributes() -> None:
    for module in modules():
        for name in module.__all__:
            thing = getattr(module, name)
            if inspect.isclass(thing) and hasattr(thing, "__dataclass_fields__"):
                text = sections(thing)["Attributes"]
                for field in thing.__dataclass_fields__:
                    assert re.search(rf"\b{field}\b", text), f"{name}.{field}"
