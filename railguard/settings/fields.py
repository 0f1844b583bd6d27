"""The named fields of one statement, and what may stand in a field.

Every complaint begins with the statement it is about and names the field, so that its reader only
has to add the place.
"""

import datetime as dt
from collections.abc import Callable, Mapping, Sequence
from typing import TypeVar

from railguard.settings.names import advice
from railguard.units import QuantityError

Number = Callable[[object, str | None], tuple[float, str]]
"""number(raw, unit) -> value, unit written: how a reader makes a number of what stands there.
Without a unit any may be written. Raises QuantityError."""

Word = TypeVar("Word", bound=str)


class StatementError(Exception):
    """A statement that cannot be obeyed; its reader adds the place.

    key  the field at fault, or "" where the statement as a whole is
    """

    def __init__(self, what: str, key: str = "", remedy: str = "") -> None:
        self.what = what
        self.key = key
        self.remedy = remedy
        super().__init__(what)


class Fields:
    """The named fields of one statement. `subject` begins every complaint: `the signal "LEVEL"`."""

    def __init__(self, subject: str, raw: Mapping[str, object], number: Number) -> None:
        self.subject = subject
        self.raw = raw
        self._number = number

    def fault(self, what: str, key: str = "", remedy: str = "") -> StatementError:
        """Build the complaint `The signal "LEVEL" ...`."""
        subject = self.subject[0].upper() + self.subject[1:]
        return StatementError(f"{subject} {what}", key, remedy)

    def only(self, *known: str) -> None:
        """Refuse a field that is none of `known`."""
        for key in self.raw:
            if key not in known:
                raise self.fault(f'has no field "{key}".', key, advice(key, known))

    def _read(self, key: str, raw: object, unit: str | None) -> float:
        try:
            return self._number(raw, unit)[0]
        except QuantityError as error:
            raise self.fault(f"cannot use its {key}: {error}", key) from error

    def number(self, key: str, unit: str | None) -> float | None:
        """Return a number in SI, or None where the field is not there."""
        raw = self.raw.get(key)
        return None if raw is None else self._read(key, raw, unit)

    def with_unit(self, key: str) -> tuple[float, str]:
        """Return a number in SI and the unit written with it, whichever that is."""
        try:
            return self._number(self.raw[key], None)
        except QuantityError as error:
            raise self.fault(f"cannot use its {key}: {error}", key) from error

    def at_least_zero(self, key: str, unit: str) -> float | None:
        """Return a number that has no sense below zero."""
        value = self.number(key, unit)
        if value is not None and value < 0:
            raise self.fault(f"has a negative {key}.", key)
        return value

    def above_zero(self, key: str, unit: str) -> float | None:
        """Return a number that has no sense at or below zero."""
        value = self.number(key, unit)
        if value is not None and value <= 0:
            raise self.fault(f"needs {key} above zero.", key)
        return value

    def share(self, key: str) -> float | None:
        """Return a tolerance: at least 0, below 1."""
        value = self.number(key, "%")
        if value is not None and not 0 <= value < 1:
            what = f"cannot use its {key}: {value * 100:g} % is no share from 0 to below 100 %."
            raise self.fault(what, key, 'Write for example "5%" or 0.05.')
        return value

    def entries(self, key: str) -> Sequence[object] | None:
        """Return a list of entries as they stand."""
        raw = self.raw.get(key)
        if raw is None:
            return None
        if not isinstance(raw, list | tuple):
            raise self.fault(f"needs a list as its {key}.", key)
        return raw

    def pair(self, key: str, unit: str) -> tuple[float, float] | None:
        """Return two numbers, the lower one first."""
        raw = self.entries(key)
        if raw is None:
            return None
        if len(raw) != 2:
            raise self.fault(f"needs two numbers as its {key}: the lowest and the highest.", key)
        low, high = (self._read(key, entry, unit) for entry in raw)
        if low > high:
            raise self.fault(f"gives its {key} with the higher number first.", key)
        return low, high

    def text(self, key: str) -> str:
        """Return a text, "" where the field is not there."""
        raw = self.raw.get(key, "")
        if not isinstance(raw, str):
            raise self.fault(f"needs a text as its {key}.", key, "Put it in quotes.")
        return raw

    def word(self, key: str, known: Sequence[Word]) -> Word | None:
        """Return one of some words, None where the field is not there."""
        written = self.text(key)
        found = next((word for word in known if word == written), None)
        if found is None and key in self.raw:
            raise self.fault(f'cannot have "{written}" as its {key}.', key, advice(written, known))
        return found

    def words(self, key: str) -> tuple[str, ...]:
        """Return a list of texts, empty where the field is not there."""
        entries = self.entries(key) or ()
        if any(not isinstance(entry, str) for entry in entries):
            raise self.fault(f"needs texts in its {key}.", key, "Put each in quotes.")
        return tuple(str(entry) for entry in entries)

    def day(self, key: str) -> dt.date | None:
        """Return a day; written as a TOML date or as text, always year-month-day."""
        raw = self.raw.get(key)
        if raw is None or (isinstance(raw, dt.date) and not isinstance(raw, dt.datetime)):
            return raw
        try:
            return dt.datetime.strptime(str(raw), "%Y-%m-%d").date()
        except ValueError as error:
            what = f'cannot use its {key}: "{raw}" is no day.'
            raise self.fault(what, key, "Write year-month-day: 2027-06-30.") from error
