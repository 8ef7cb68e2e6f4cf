"""Field types of the models: text with a unit becomes a float in SI."""

from __future__ import annotations

import re
from typing import Annotated, Any

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, WithJsonSchema
from pydantic_core import PydanticCustomError

from benchrun.quantity import Dimension, parse, parse_range

__all__ = [
    "LABEL",
    "Capacitance",
    "Current",
    "Decibel",
    "Delay",
    "Duration",
    "FileModel",
    "Frequency",
    "FrequencyRange",
    "Impedance",
    "Inductance",
    "Listed",
    "LossRate",
    "Name",
    "Power",
    "PowerRange",
    "Voltage",
    "trouble",
]


HIGHEST_HZ = 1e13
"""Far above any RF part; beyond lies a slip of the prefix."""


class FileModel(BaseModel):
    """Strict, frozen, and closed: what is not known is refused."""

    model_config = ConfigDict(
        strict=True, frozen=True, extra="forbid", allow_inf_nan=False, populate_by_name=False
    )


def _schema(dimension: Dimension, ranged: bool = False) -> WithJsonSchema:
    example = dimension.example
    number = r"[+-]?[0-9.]+([eE][+-]?[0-9]+)?"
    prefix = "[fpnuµμmkMGT]?" if dimension.scaled else ""
    others = "".join(f"|{re.escape(other)}" for other in _OTHER_SPELLINGS.get(dimension.unit, ()))
    one = rf"{number} *({prefix}{re.escape(dimension.unit)}{others})"
    return WithJsonSchema(
        {
            "type": "string",
            "pattern": f"^{one} to {one}$" if ranged else f"^{one}$",
            "examples": [f"{example} to {example}" if ranged else example],
            "description": f"{'Range' if ranged else 'Value'} with its unit ({dimension.unit})",
        }
    )


_OTHER_SPELLINGS = {
    "s": ("sec", "min", "h", "d"), "ohm": ("Ω", "ohms", "Ohm"), "deg": ("°",), "degC": ("°C",),
    "N m": ("Nm", "N*m"),
}  # fmt: skip


def _range(text: Any, dimension: Dimension) -> tuple[float, float]:
    low, high = parse_range(text, dimension)
    if dimension is Dimension.FREQUENCY and not 0.0 <= low < high <= HIGHEST_HZ:
        raise ValueError(f"{text!r} is no range of frequencies; they lie from 0 Hz to {HIGHEST_HZ:g} Hz")
    return low, high


def _value(dimension: Dimension) -> Any:
    return BeforeValidator(lambda text: parse(text, dimension))


Frequency = Annotated[
    float, Field(ge=0, le=HIGHEST_HZ), _value(Dimension.FREQUENCY), _schema(Dimension.FREQUENCY)
]
FrequencyRange = Annotated[
    tuple[float, float],
    BeforeValidator(lambda text: _range(text, Dimension.FREQUENCY)),
    _schema(Dimension.FREQUENCY, True),
]
PowerRange = Annotated[
    tuple[float, float],
    BeforeValidator(lambda text: _range(text, Dimension.POWER)),
    _schema(Dimension.POWER, True),
]
Power = Annotated[float, Field(ge=-200, le=100), _value(Dimension.POWER), _schema(Dimension.POWER)]
Decibel = Annotated[float, Field(ge=-300, le=300), _value(Dimension.RATIO), _schema(Dimension.RATIO)]
Duration = Annotated[float, Field(gt=0), _value(Dimension.TIME), _schema(Dimension.TIME)]
Delay = Annotated[float, Field(ge=0), _value(Dimension.TIME), _schema(Dimension.TIME)]
Current = Annotated[float, Field(gt=0), _value(Dimension.CURRENT), _schema(Dimension.CURRENT)]
Voltage = Annotated[float, _value(Dimension.VOLTAGE), _schema(Dimension.VOLTAGE)]
Impedance = Annotated[float, Field(gt=0), _value(Dimension.IMPEDANCE), _schema(Dimension.IMPEDANCE)]
Capacitance = Annotated[float, _value(Dimension.CAPACITANCE), _schema(Dimension.CAPACITANCE)]
Inductance = Annotated[float, _value(Dimension.INDUCTANCE), _schema(Dimension.INDUCTANCE)]
LossRate = Annotated[float, Field(ge=0), _value(Dimension.LOSS_RATE), _schema(Dimension.LOSS_RATE)]
Name = Annotated[
    str, Field(pattern=r"^[a-z0-9][a-z0-9-]{0,62}$", description="lower-case letters, digits, hyphens")
]


def _as_tuple(value: object) -> object:
    return tuple(value) if isinstance(value, list) else value


LABEL = "\x1f"
"""Begins the labels of alternatives, so that no key of a file can be taken for one (see ``loading``)."""

Listed = BeforeValidator(_as_tuple)
"""Put on tuple fields: a file writes lists, a frozen model keeps tuples."""


def trouble(message: str, key: str = "") -> PydanticCustomError:
    """Make an error of a whole model that still points at one of its keys."""
    return PydanticCustomError("benchrun", "{message}", {"message": message, "key": key})
