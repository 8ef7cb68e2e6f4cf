"""Field types of the models: text with a unit becomes a float in SI."""

from __future__ import annotations

import re
from typing import Annotated, Any

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, WithJsonSchema
from pydantic_core import PydanticCustomError

from benchrun.quantity import Dimension, parse, parse_range

__all__ = [
    "Capacitance", "Decibel", "Delay", "Duration", "FileModel", "Frequency", "FrequencyRange", "Impedance",
    "Inductance", "Listed", "LossRate", "Name", "Power", "PowerRange", "Voltage", "trouble",
]  # fmt: skip


class FileModel(BaseModel):
    """Strict, frozen, and closed: what is not known is refused."""

    model_config = ConfigDict(
        strict=True, frozen=True, extra="forbid", allow_inf_nan=False, populate_by_name=False
    )


def _schema(dimension: Dimension, ranged: bool = False) -> WithJsonSchema:
    example = dimension.example
    number = r"[+-]?[0-9.]+([eE][+-]?[0-9]+)?"
    prefix = "[fpnuµmkMGT]?" if dimension.scaled else ""
    unit = {"s": "(s|min|h|d)"}.get(dimension.unit, re.escape(dimension.unit))
    one = rf"{number} *{prefix}{unit}"
    return WithJsonSchema(
        {
            "type": "string",
            "pattern": f"^{one} to {one}$" if ranged else f"^{one}$",
            "examples": [f"{example} to {example}" if ranged else example],
            "description": f"{'Range' if ranged else 'Value'} with its unit ({dimension.unit})",
        }
    )


def _value(dimension: Dimension) -> Any:
    return BeforeValidator(lambda text: parse(text, dimension))


Frequency = Annotated[float, Field(ge=0), _value(Dimension.FREQUENCY), _schema(Dimension.FREQUENCY)]
FrequencyRange = Annotated[
    tuple[float, float],
    BeforeValidator(lambda text: parse_range(text, Dimension.FREQUENCY)),
    _schema(Dimension.FREQUENCY, True),
]
PowerRange = Annotated[
    tuple[float, float],
    BeforeValidator(lambda text: parse_range(text, Dimension.POWER)),
    _schema(Dimension.POWER, True),
]
Power = Annotated[float, Field(ge=-200, le=100), _value(Dimension.POWER), _schema(Dimension.POWER)]
Decibel = Annotated[float, Field(ge=-300, le=300), _value(Dimension.RATIO), _schema(Dimension.RATIO)]
Duration = Annotated[float, Field(gt=0), _value(Dimension.TIME), _schema(Dimension.TIME)]
Delay = Annotated[float, Field(ge=0), _value(Dimension.TIME), _schema(Dimension.TIME)]
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


Listed = BeforeValidator(_as_tuple)
"""Put on tuple fields: a file writes lists, a frozen model keeps tuples."""


def trouble(message: str, key: str = "") -> PydanticCustomError:
    """An error of a whole model that still points at one of its keys."""
    return PydanticCustomError("benchrun", "{message}", {"message": message, "key": key})
