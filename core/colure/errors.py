"""The errors a caller can meet: each says what, where, which value and what was expected.

ColureError
├── AngleError          text that is no angle, or an angle out of its range
├── MomentError         text that is no date, an impossible date, a scale that does not reach
├── FrameError          a frame that does not exist, or needs what was not given
│   └── FrameMismatch   two rotations that do not meet
├── SiteError           an unknown site
├── BodyError           an unknown body
├── TargetError         a name that is in no list
├── SpanError           understood, but outside the span of a model  (exit code 1)
│   └── EphemerisSpanError
├── TableError          a file of rows that cannot be read
├── SessionError        a session file that cannot be read
└── ResourceError       a shipped data file that is missing or damaged
"""

from collections.abc import Iterable


class ColureError(Exception):
    """Base of every error that Colure raises on purpose; `str()` is one line fit for a user."""

    exit_code = 2


class AngleError(ColureError):
    """Text that is no angle, or an angle out of its range."""


class MomentError(ColureError):
    """Text that is no date, an impossible date, or a time scale that does not reach there."""


class FrameError(ColureError):
    """A frame that does not exist, or that needs a site or a moment that was not given."""


class FrameMismatch(FrameError):
    """Two rotations, or a rotation and a vector, whose frames do not meet."""


class SiteError(ColureError):
    """A site that is in no list, or coordinates that are no site."""


class BodyError(ColureError):
    """A body that is not known."""


class TargetError(ColureError):
    """A star, object or position that is in no list."""


class SpanError(ColureError):
    """Understood, but outside what a model covers: there is no answer."""

    exit_code = 1


class EphemerisSpanError(SpanError):
    """Moments outside an ephemeris; `mask` marks the offending elements of the moments asked for."""

    def __init__(self, message: str, mask: object = None) -> None:
        super().__init__(message)
        self.mask = mask


class TableError(ColureError):
    """A table that cannot be read or written."""


class SessionError(ColureError):
    """A session file that cannot be read."""


class ResourceError(ColureError):
    """A shipped data file that is missing or damaged."""


def near_names(wrong: str, known: Iterable[str], most: int = 3) -> str:
    """Return `"; did you mean 'a' or 'b'?"` for a misspelt name, or an empty string.

    Comparison ignores case; the spelling returned is that of `known`.
    """
    import difflib  # late: no use before the first mistake

    spelling = {name.casefold(): name for name in known}
    found = difflib.get_close_matches(wrong.casefold(), spelling, n=most, cutoff=0.6)
    if not found:
        return ""
    quoted = [f"'{spelling[name]}'" for name in found]
    listed = quoted[0] if len(quoted) == 1 else ", ".join(quoted[:-1]) + " or " + quoted[-1]
    return f"; did you mean {listed}?"
