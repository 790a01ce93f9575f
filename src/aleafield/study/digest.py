"""The fingerprint of a study: what decides its samples and its solutions, and nothing else."""

from __future__ import annotations

import dataclasses
import hashlib
import json
from collections.abc import Mapping
from typing import Any

from aleafield.formula import Formula
from aleafield.randomness.laws import Law, Sampled
from aleafield.study.study import Study

_LEFT_OUT = frozenset({"title", "about", "report", "source", "digest", "warnings"})


def description(study: Study) -> str:
    """Everything that decides the samples and the solver, as JSON text with one fixed form.

    Comments, formatting, title, about and the report section are not in it; defaults are, so that writing one
    out changes nothing.  Tables keep the order of their entries, which is the order of the inputs.
    """
    content = {
        entry.name: _plain(getattr(study, entry.name))
        for entry in dataclasses.fields(study)
        if entry.name not in _LEFT_OUT
    }
    return json.dumps(content, ensure_ascii=False, indent=1)


def digest_of(study: Study) -> str:
    """SHA-256 of the description, in hexadecimal digits."""
    return hashlib.sha256(description(study).encode()).hexdigest()


def _plain(value: Any) -> Any:
    """Numbers, texts, lists and objects in place of the study's records."""
    if isinstance(value, Formula):
        return {"formula": value.text}
    if isinstance(value, Sampled):
        content = json.dumps(value.values).encode()
        return {"law": value.text, "values": hashlib.sha256(content).hexdigest()}
    if isinstance(value, Law):
        return {"law": value.text}
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        fields = {entry.name: _plain(getattr(value, entry.name)) for entry in dataclasses.fields(value)}
        return {"is": type(value).__name__, **fields}
    if isinstance(value, Mapping):
        return [[key, _plain(entry)] for key, entry in value.items()]
    if isinstance(value, tuple | list):
        return [_plain(entry) for entry in value]
    if callable(value):
        return {"function": f"{value.__module__}.{getattr(value, '__qualname__', type(value).__name__)}"}
    return value
