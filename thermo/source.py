"""Where a model comes from, and a note when it was used outside its range."""

from dataclasses import dataclass
from typing import Literal

Status = Literal["read", "derived", "remembered", "estimate"]


@dataclass(frozen=True)
class Source:
    """Provenance of one model.

    ``status`` is ``read`` when the work was opened, ``derived`` when computed
    from read or exact parameters, ``remembered`` when not re-read, ``estimate``
    for an engineering judgement without a single source.
    """

    model: str
    work: str
    locator: str
    status: Status


@dataclass(frozen=True)
class RangeNote:
    """A model that was used outside the range its source gives."""

    model: str
    quantity: str
    value: str
    allowed: str

    def __str__(self) -> str:
        return f"{self.model}: {self.quantity} = {self.value}, source holds for {self.allowed}"
