"""Where words go on a drawing so that none covers another: rectangles tried in order of preference."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Box:
    """A rectangle, in cells or in points; `right` and `bottom` are just outside."""

    left: float
    top: float
    right: float
    bottom: float

    def meets(self, other: Box) -> bool:
        """Whether two rectangles share any area."""
        return (
            self.left < other.right and other.left < self.right and self.top < other.bottom and other.top < self.bottom
        )

    def inside(self, other: Box) -> bool:
        """Whether it lies within another."""
        return (
            self.left >= other.left
            and self.right <= other.right
            and self.top >= other.top
            and self.bottom <= other.bottom
        )


class Placer:
    """Rectangles that are taken, hard ones (words, marks) and soft ones (lines).

    Parameters
    ----------
    bounds : Box
        Nothing is placed outside.
    pitch : tuple of float
        Width and height of the squares by which neighbours are found; about those of a short word.
    """

    def __init__(self, bounds: Box, *, pitch: tuple[float, float] = (12.0, 1.0)) -> None:
        self._bounds = bounds
        self._pitch = pitch
        self._hard: dict[tuple[int, int], list[Box]] = {}
        self._soft: dict[tuple[int, int], list[Box]] = {}

    def take(self, box: Box, *, soft: bool = False) -> None:
        """Mark a rectangle as taken; a soft one may be covered where nothing better is free."""
        taken = self._soft if soft else self._hard
        for square in self._squares(box):
            taken.setdefault(square, []).append(box)

    def place(self, candidates: Sequence[Box], *, cover_lines: bool = True) -> Box | None:
        """The first candidate that is free, else the first that covers lines alone, else None; what is placed is taken."""
        covering: Box | None = None
        for box in candidates:
            if not box.inside(self._bounds) or self._meets(box, self._hard):
                continue
            if not self._meets(box, self._soft):
                self.take(box)
                return box
            if covering is None:
                covering = box
        if covering is None or not cover_lines:
            return None
        self.take(covering)
        return covering

    def _squares(self, box: Box) -> Iterator[tuple[int, int]]:
        width, height = self._pitch
        for column in range(int(box.left // width), int(box.right // width) + 1):
            for row in range(int(box.top // height), int(box.bottom // height) + 1):
                yield column, row

    def _meets(self, box: Box, taken: dict[tuple[int, int], list[Box]]) -> bool:
        return any(box.meets(other) for square in self._squares(box) for other in taken.get(square, ()))
