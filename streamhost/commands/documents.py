"""Results as JSON documents: a frozen dataclass becomes an object, each field under its name."""

from collections.abc import Mapping
from dataclasses import fields, is_dataclass
from typing import Any

import numpy as np


def document_of(result: object) -> Any:
    """Objects, lists, numbers, texts and None from dataclasses, tuples and numbers of any kind.

    Fields marked as curves, `field(metadata={"curve": True})`, are left out: they are for figures and files.
    """
    if is_dataclass(result) and not isinstance(result, type):
        shown = [field for field in fields(result) if not field.metadata.get("curve")]
        return {field.name: document_of(getattr(result, field.name)) for field in shown}
    if isinstance(result, Mapping):
        return {str(key): document_of(value) for key, value in result.items()}
    if isinstance(result, list | tuple):
        return [document_of(value) for value in result]
    if isinstance(result, np.generic):
        return document_of(result.item())
    assert result is None or isinstance(result, str | bool | int | float), f"{type(result)} is no figure"
    return result
