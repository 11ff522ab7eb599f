"""What the Landscape says in words: subtitle, axis titles, readout, legend, and the text for a screen reader. No Qt."""

from __future__ import annotations

from dataclasses import dataclass

from spreadgui.desk.landscape.levels import Levels
from spreadgui.desk.landscape.notation import Notation, finer, for_forwards
from spreadgui.pricing.methods import method
from spreadgui.valuation.surface import Surface, quantity_of

KEYS = "Arrow keys move a crosshair, with Shift ten steps at a time; Escape puts it away."
PRICING = "pricing"


@dataclass(frozen=True)
class Entry:
    """One entry of the legend: the `mark` that is drawn ("point", "dashed", "dotted", or none) and what it means."""

    mark: str
    words: str

    def spoken(self) -> str:
        """The entry without its drawing."""
        return f"{self.mark}: {self.words}" if self.mark else self.words


class Words:
    """The words for one drawn surface."""

    def __init__(self, surface: Surface, levels: Levels) -> None:
        self._surface, self._levels = surface, levels
        self._name = quantity_of(surface.request.quantity).name
        self.long = for_forwards(float(surface.long[0]), float(surface.long[-1]))
        self.short = for_forwards(float(surface.short[0]), float(surface.short[-1]))
        self.values = finer(levels.largest, levels.step)

    def subtitle(self) -> str:
        """Position, quantity, method, unit."""
        return subtitle_of(self._surface)

    def axis_titles(self, long: Notation, short: Notation) -> tuple[str, str]:
        """The two underlyings, with the power of ten that their ticks are written in."""
        (long_name, short_name), (long_unit, short_unit) = self._surface.axes, self._surface.axis_units
        return _axis_title("Long", long_name, long_unit, long), _axis_title("Short", short_name, short_unit, short)

    def value_title(self, ticks: Notation) -> str:
        """The quantity and its unit, for the colour bar."""
        return ", ".join(filter(None, (self._name, ticks.unit(self._surface.unit))))

    def current_value(self) -> str:
        """The value where the marks stand."""
        return self.values.text(self._surface.current[2])

    def at_marks(self) -> str:
        """Where the marks stand, and the value there."""
        return f"At the marks: {self._point(*self._surface.current)}"

    def at_crosshair(self, long: float, short: float) -> str:
        """A point of the rectangle and the value there."""
        return f"At the crosshair: {self._point(long, short, self._surface.value_at(long, short))}"

    def legend(self) -> tuple[Entry, ...]:
        """What the drawn marks mean; of what is not in sight nothing is said."""
        entries = [Entry("point", "marks now")]
        if self._surface.boundary.shape[1]:
            is_forward = self._surface.kind == "forward"
            words = "payoff of zero at expiry" if is_forward else "exercise boundary at expiry"
            entries.append(Entry("dashed", words))
        if self._surface.rings:
            entries.append(Entry("dotted", "1 and 2 standard deviations at expiry"))
        if self._levels.flat:
            entries.append(Entry("", f"flat: {self._value(self._surface.current[2])} everywhere"))
        return tuple(entries)

    def name(self) -> str:
        """The plot's name for a screen reader."""
        return f"Landscape of {self._surface.subject}: {self._name.lower()} over its two forwards"

    def description(self) -> str:
        """The plot in sentences: range, value at the marks, what is drawn, how to read it by keyboard."""
        values = self._surface.values
        reach = f"{self._name} from {self._value(float(values.min()))} to {self._value(float(values.max()))}."
        legend = "; ".join(entry.spoken() for entry in self.legend())
        return f"{reach} {self.at_marks()}. {legend[:1].upper()}{legend[1:]}. {KEYS}"

    def _point(self, long: float, short: float, value: float) -> str:
        name = self._name.lower()
        return f"long {self.long.phrase(long)}, short {self.short.phrase(short)}, {name} {self._value(value)}"

    def _value(self, value: float) -> str:
        return self.values.phrase(value, self._surface.unit)


def subtitle_of(surface: Surface) -> str:
    """Position, quantity, method, unit of any surface, drawn or not; a forward is the same by every method."""
    by = "every method" if surface.kind == "forward" else surface.method or method(surface.request.method).name
    quantity = quantity_of(surface.request.quantity).name.lower()
    return " · ".join(filter(None, (surface.subject, quantity, by, surface.unit)))


def _axis_title(side: str, name: str, unit: str, ticks: Notation) -> str:
    """The axis' name, with the power of ten that its ticks are written in before the unit."""
    market = name.removesuffix(f", {unit}") if unit else name
    return ", ".join(filter(None, (f"{side}: {market}", ticks.unit(unit))))
