"""What the ledger's panel shows the ledger of: the selected object, or a direction under the pointer."""

from dataclasses import dataclass

from colure import ledger, pointing
from colure.arrays import Float
from colure.ledger import Ledger
from colure.reduction import Observer
from colure.session import Session
from colure.sky import observer_of


@dataclass(frozen=True, slots=True, eq=False)
class Subject:
    """What the ledger is of: an object or a direction as the chart has it; `key` tells one from another."""

    kind: str
    row: int
    name: str
    vector: Float
    sigma_arcsec: float

    @property
    def key(self) -> tuple[object, ...]:
        """What its ledger depends on."""
        moving = self.kind in (pointing.BODIES, pointing.STARS)
        return (self.kind, self.row, self.name, None if moving else tuple(self.vector.tolist()))


def reduced(subject: Subject, session: Session, frame: str, place: str | None) -> Ledger:
    """Return the ledger of what a chart shows: a body and a star from their own data, all else led back first."""
    observer: Observer = observer_of(session)
    asked = {"observer": observer, "place": place, "frame": frame, "omitted": session.omitted}
    if subject.kind == pointing.BODIES:
        return ledger.body(subject.name.casefold(), session.moment, **asked)  # type: ignore[arg-type]
    if subject.kind == pointing.STARS:
        return ledger.star(subject.row, session.moment, name=subject.name, **asked)
    return ledger.direction(
        subject.vector, session.moment, seen=session.place, name=subject.name,
        sigma_arcsec=subject.sigma_arcsec, **asked,  # type: ignore[arg-type]
    )  # fmt: skip
