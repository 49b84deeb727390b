"""
Frozen dataclasses to JSON values and back, by their type hints, without loss.

Infinity and NaN never reach a file: as a mapping's value infinity is written as null, elsewhere both are refused.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import fields, is_dataclass
from enum import StrEnum
from functools import cache
from types import NoneType, UnionType
from typing import Any, Union, get_args, get_origin, get_type_hints

from siting.errors import PlanFileError
from siting.plan.proof import Proof
from siting.study.tables import Leg

NAMES = {"Mapping": Mapping, "Leg": Leg, "Proof": Proof}
"""What the hints of plan types name beyond their own module."""


def encode(value: object) -> Any:  # noqa: ANN401  # a JSON value
    """
    Return a dataclass, enum, tuple, mapping or plain value as a JSON value.

    Parameters
    ----------
    value
        Dataclasses become objects with one key a field, enums and mapping keys become text.

    Returns
    -------
    value
        Of dict, list, str, int, float, bool or None.

    Raises
    ------
    ValueError
        If a number is NaN, or infinite outside a mapping: no plan holds one.
    """
    if is_dataclass(value) and not isinstance(value, type):
        return {field.name: encode(getattr(value, field.name)) for field in fields(value)}
    if isinstance(value, Mapping):
        return {str(key): None if held == math.inf else encode(held) for key, held in value.items()}
    if isinstance(value, tuple):
        return [encode(item) for item in value]
    if isinstance(value, StrEnum):
        return str(value)
    if isinstance(value, float):
        if not math.isfinite(value):
            msg = f"a plan cannot hold the number {value}"
            raise ValueError(msg)
        return float(value)
    return value


@cache
def _hints(kind: type) -> dict[str, Any]:
    return get_type_hints(kind, localns=NAMES)


def decode(hint: Any, value: object, where: str) -> Any:  # noqa: ANN401  # built by the hint
    """
    Return the value a type hint asks for from a JSON value.

    Parameters
    ----------
    hint
        A dataclass, enum, plain type, `X | None`, `tuple[X, ...]` or `Mapping[K, V]`.
    value
        The JSON value.
    where
        Its path in the file, for messages.

    Returns
    -------
    value
        Of the type of the hint.

    Raises
    ------
    PlanFileError
        If the value does not fit. The message gives the path, what is there and what is wanted.
    """
    origin = get_origin(hint)
    if origin in {Union, UnionType}:
        inner = [part for part in get_args(hint) if part is not NoneType]
        return None if value is None else decode(inner[0], value, where)
    if origin is tuple:
        items = _wanted(value, list, "a list", where)
        return tuple(decode(get_args(hint)[0], item, f"{where}[{at}]") for at, item in enumerate(items))
    if origin is Mapping:
        return _mapping(hint, _wanted(value, dict, "an object", where), where)
    if is_dataclass(hint) and isinstance(hint, type):
        return _object(hint, _wanted(value, dict, "an object", where), where)
    if isinstance(hint, type) and issubclass(hint, StrEnum):
        if value not in set(hint):
            raise _misfit(value, f"one of {', '.join(hint)}", where)
        return hint(str(value))
    return _plain(hint, value, where)


def _plain(hint: type, value: object, where: str) -> object:
    """Return a text, flag or number."""
    if hint is str:
        return _wanted(value, str, "text", where)
    if hint is bool:
        return _wanted(value, bool, "true or false", where)
    if isinstance(value, bool) or not isinstance(value, (int, float)) or not math.isfinite(value):
        raise _misfit(value, "a number", where)
    if hint is int and not isinstance(value, int):
        raise _misfit(value, "a whole number", where)
    return hint(value)


def _mapping(hint: Any, value: dict[str, object], where: str) -> dict[Any, Any]:  # noqa: ANN401  # a type hint
    """Return a mapping; null stands for infinity."""
    (key_hint, value_hint), found = get_args(hint), {}
    for key, held in value.items():
        try:
            name = key_hint(key)
        except ValueError:
            raise _misfit(key, "a known name as key", where) from None
        found[name] = math.inf if held is None else decode(value_hint, held, f"{where}.{key}")
    return found


def _object(kind: type, value: dict[str, object], where: str) -> object:
    """Return a dataclass with every field given and no other."""
    hints = _hints(kind)
    missing, unknown = hints.keys() - value.keys(), value.keys() - hints.keys()
    if missing:
        msg = f"{where}: {', '.join(sorted(missing))} missing. Write the plan again with `siting plan --out`."
        raise PlanFileError(msg)
    if unknown:
        msg = f"{where}: {', '.join(sorted(unknown))} unknown. It was written by a newer version or edited by hand."
        raise PlanFileError(msg)
    return kind(**{name: decode(hint, value[name], f"{where}.{name}") for name, hint in hints.items()})


def _wanted(value: object, kind: type, what: str, where: str) -> Any:  # noqa: ANN401  # of `kind`
    """Return the value if it is of the kind wanted."""
    if not isinstance(value, kind):
        raise _misfit(value, what, where)
    return value


def _misfit(value: object, what: str, where: str) -> PlanFileError:
    text = repr(value)
    shown = text if len(text) <= 60 else f"{text[:57]}..."  # noqa: PLR2004  # one line of a terminal
    return PlanFileError(f"{where}: {shown} is not {what}. Write the plan again with `siting plan --out`.")
