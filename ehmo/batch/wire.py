"""Messages between a batch and its worker processes: one line of JSON each, and nothing but plain data in it."""

from __future__ import annotations

import base64
import json
from collections.abc import Mapping, Sequence
from typing import Any

from ehmo.batch.items import BatchSettings, WorkItem, item_of, plain_item, settings_of
from ehmo.batch.known import KnownKeys
from ehmo.batch.work import Begun, Finished, Outcome, Skipped
from ehmo.store import PackedRow

Message = dict[str, Any]


def line_of(message: Message) -> bytes:
    """Message as a line."""
    return json.dumps(message, separators=(",", ":"), allow_nan=False).encode("ascii") + b"\n"


def message_of(line: bytes) -> Message:
    """Message of a line.

    Raises
    ------
    ValueError
        If it is none.
    """
    message = json.loads(line)
    if not isinstance(message, dict):
        raise ValueError("no message")
    return message


def start_message(
    settings: BatchSettings, known: KnownKeys, memory_limit: int | None, time_limit_s: float | None
) -> Message:
    """What a worker is told first."""
    return {
        "settings": settings.plain(),
        "known": base64.b64encode(known.packed).decode("ascii"),
        "memory_limit": memory_limit,
        "time_limit_s": time_limit_s,
    }


def settings_message(settings: BatchSettings, known: KnownKeys, limits: Mapping[str, Any]) -> bytes:
    """What every chunk of a cluster shares: settings, known keys and limits, as a line."""
    known_text = base64.b64encode(known.packed).decode("ascii")
    return line_of({"settings": settings.plain(), "known": known_text, "limits": dict(limits)})


def settings_of_message(message: Message) -> tuple[BatchSettings, KnownKeys, dict[str, Any]]:
    """Settings, known keys and limits of such a message."""
    known = KnownKeys(base64.b64decode(message["known"]))
    return settings_of(message["settings"]), known, dict(message["limits"])


def started(message: Message) -> tuple[BatchSettings, KnownKeys, int | None, float | None]:
    """Settings, known keys, memory limit and time limit of the first message."""
    known = KnownKeys(base64.b64decode(message["known"]))
    return settings_of(message["settings"]), known, message["memory_limit"], message["time_limit_s"]


def items_message(items: Sequence[WorkItem]) -> Message:
    """Items to work off."""
    return {"items": [plain_item(item) for item in items]}


def items_of(message: Message) -> list[WorkItem]:
    """Items of a message."""
    return [item_of(data) for data in message["items"]]


def outcome_message(outcome: Outcome) -> Message:
    """Outcome as a message."""
    if isinstance(outcome, Begun):
        return {"begun": outcome.key, "entry": outcome.entry}
    if isinstance(outcome, Skipped):
        return {"skipped": outcome.key}
    row = outcome.row
    return {
        "row": row.structure,
        "bonds": row.bonds,
        "document": None if row.document is None else base64.b64encode(row.document).decode("ascii"),
        "reason": outcome.reason,
        "read_s": outcome.read_s,
        "calculate_s": outcome.calculate_s,
        "record_s": outcome.record_s,
    }


def outcome_of(message: Message) -> Outcome:
    """Outcome of a message."""
    if "begun" in message:
        return Begun(message["begun"], message["entry"])
    if "skipped" in message:
        return Skipped(message["skipped"])
    document = message["document"]
    row = PackedRow(message["row"], tuple(message["bonds"]), None if document is None else base64.b64decode(document))
    return Finished(row, message["reason"], message["read_s"], message["calculate_s"], message["record_s"])
