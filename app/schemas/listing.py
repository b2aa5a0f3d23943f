"""Envelopes: a page of a listing, a definition as stored, and what became of one that was sent."""

from __future__ import annotations

from typing import Any, Generic, Literal, TypeVar

from pydantic import ConfigDict, Field

from app.schemas.types import Answer, AnsweredInstant, Items, is_none

T = TypeVar("T")

LIMIT, LARGEST_LIMIT = 1_000, 10_000
"""Items of a page, if not said, and at most."""


class _Described(Answer):
    """An envelope whose forms for each content keep its description."""

    @classmethod
    def __pydantic_init_subclass__(cls, **kwargs: Any) -> None:
        super().__pydantic_init_subclass__(**kwargs)
        cls.__doc__ = cls.__doc__ or next(one.__doc__ for one in cls.__mro__[1:] if one.__doc__)


class Page(_Described, Generic[T]):
    """Part of a listing, oldest first; its pages share what was known."""

    model_config = ConfigDict(
        json_schema_extra={"examples": [{"items": [], "next": None, "known_at": "2026-03-14T05:00:02.417311Z"}]}
    )

    items: Items[T] = Field(description="The items of this page")
    next: str | None = Field(description="Cursor of the next page; null on the last")
    known_at: AnsweredInstant | None = Field(
        default=None, exclude_if=is_none, description="The latest record that the listing includes"
    )


class Defined(_Described, Generic[T]):
    """A definition as stored: its body as it was sent, and since when it holds."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "id": "tk-12",
                    "effective_from": "2026-03-14T05:00:00Z",
                    "revision": 1,
                    "recorded_at": "2026-03-14T08:12:45.120031Z",
                    "definition": {},
                }
            ]
        }
    )

    id: str = Field(description="Its id")
    effective_from: AnsweredInstant | None = Field(description="From when it holds; null: for all time before, too")
    revision: int = Field(ge=1, description="1 for the first text of this effective_from, then counted up")
    recorded_at: AnsweredInstant = Field(description="When it was recorded")
    definition: T = Field(description="The body as it was sent, defaults not filled in")


class Written(Answer):
    """What became of a definition or a transfer that was sent."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [{"id": "tk-12", "outcome": "created", "known_at": "2026-03-14T08:12:45.120031Z"}]
        }
    )

    id: str = Field(description="Its id")
    outcome: Literal["created", "revised", "unchanged"] = Field(description="What sending it changed")
    known_at: AnsweredInstant | None = Field(description="The latest record that the answer includes")
