"""What stands behind the question mark, checked by a model before a page reads it."""

from __future__ import annotations

from collections import defaultdict
from typing import TypeVar

from pydantic import BaseModel, ValidationError
from starlette.requests import Request

from archive.errors import BadRequest

__all__ = ["asked"]

Model = TypeVar("Model", bound=BaseModel)

_LONGEST = 2000
_MOST = 200


def asked(request: Request, model: type[Model]) -> Model:
    """Return the query of a request as a model; empty fields, as a form sends them, are as if they were not there.

    Parameters
    ----------
    request : Request
    model : type
        A pydantic model with `extra="forbid"`; a field that may be given several times is a tuple.

    Raises
    ------
    BadRequest
        With the field that is wrong, what was found, and what is expected.
    """
    given = [(name, value) for name, value in request.query_params.multi_items() if value.strip()]
    if len(given) > _MOST or any(len(value) > _LONGEST for _, value in given):
        raise BadRequest(
            "the question is too long", expected=f"at most {_MOST} fields of at most {_LONGEST} characters"
        )
    values: dict[str, list[str]] = defaultdict(list)
    for name, value in given:
        values[name].append(value)
    fields = {field.alias or name: field for name, field in model.model_fields.items()}
    several = {name for name, field in fields.items() if "tuple" in str(field.annotation)}
    for name, found in values.items():
        if len(found) > 1 and name not in several:
            raise BadRequest(f"{name} is given {len(found)} times", field=name[:80], expected="once")
    try:
        return model.model_validate(
            {name: tuple(found) if name in several else found[0] for name, found in values.items()}
        )
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        place = ".".join(str(part) for part in first["loc"])[:80]
        known = ", ".join(fields)
        if first["type"] == "extra_forbidden":
            raise BadRequest("there is no such field", field=place, expected=f"one of: {known}") from None
        said = str(first.get("ctx", {}).get("error", first["msg"]))
        raise BadRequest(said[:1].lower() + said[1:], field=place, found=repr(first["input"])[:200]) from None
