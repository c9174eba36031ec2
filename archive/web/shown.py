"""What a question behind a chart's address may say, and the same question as an address again."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Annotated, Any, Literal
from urllib.parse import urlencode

from pydantic import BaseModel, ConfigDict, Field, FiniteFloat, StringConstraints
from starlette.requests import Request

from archive.lab.curves.chart import Asked
from archive.lab.curves.ink import InkName
from archive.web.links import address_at

__all__ = ["Download", "Pictured", "Shown", "asked_for", "question"]

ColumnName = Annotated[str, StringConstraints(max_length=200)]


class Shown(BaseModel):
    """What is drawn: abscissa, ordinates, what is laid over, and the part that is seen."""

    model_config = ConfigDict(extra="forbid", frozen=True)

    against: ColumnName | None = None
    y: tuple[ColumnName, ...] = ()
    over: tuple[Annotated[str, StringConstraints(max_length=400)], ...] = Field(default=(), alias="with")
    low: FiniteFloat | None = Field(default=None, alias="from")
    high: FiniteFloat | None = Field(default=None, alias="to")


class Pictured(Shown):
    """A chart as a picture or as points."""

    ink: InkName = "light"
    width: int = Field(default=960, ge=300, le=2400)


class Download(Shown):
    """A chart as a file."""

    form: Literal["csv", "hdf5", "svg", "pdf"] = Field(alias="as")


def asked_for(request: Request, shown: Shown, *, most: int = 5600) -> Asked:
    """Return what is to be drawn of the address in a request's path.

    Parameters
    ----------
    request : Request
    shown : Shown
    most : int
        Most points of a curve.
    """
    # A form adds an address as it was typed.
    over = tuple(each.strip() for each in shown.over if each.strip())
    return Asked(
        address_at(request.path_params["address"]), shown.against, shown.y, over, shown.low, shown.high, most
    )


def question(shown: Shown, **changed: Any) -> str:
    """Return the question as it stands behind the question mark, with some fields changed; "" for none.

    Parameters
    ----------
    shown : Shown
    **changed
        Fields by the names of the model; None or an empty tuple leaves one out.
    """
    own = {name: field.alias or name for name, field in type(shown).model_fields.items()}
    values = {name: getattr(shown, name) for name in own} | changed
    pairs = [
        (own.get(name, name), _text(each))
        for name, value in values.items()
        for each in _several(value)
        if each is not None
    ]
    return "?" + urlencode(pairs) if pairs else ""


def _several(value: Any) -> Iterable[Any]:
    return value if isinstance(value, tuple | list) else (value,)


def _text(value: object) -> str:
    return f"{value:.12g}" if isinstance(value, float) else str(value)
