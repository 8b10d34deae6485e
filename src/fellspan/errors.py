"""Every error that Fellspan raises on purpose; imports nothing of Fellspan.

    FellspanError
    |-- QuantityError            ValueError    a text is no frequency, length, level ...
    |-- CoordinateError          ValueError    a text is no position on Earth
    |-- MagneticModelError       ValueError    the date lies outside the magnetic model
    |-- TerrainError             ValueError
    |   |-- RasterError                        a file cannot serve as a raster
    |   |-- TerrainGapError                    no elevation on part of a path
    |   |-- VerticalDatumError                 heights of different datums would be mixed
    |   |-- SeamError                          overlapping rasters disagree beyond their errors
    |   |-- ObstacleFileError                  an obstacle file has a wrong row
    |   `-- SurveyFileError                    a survey file has a wrong row
    |-- AntennaError             ValueError    an antenna or a pattern file cannot be used as given
    |-- LinkError                ValueError    a link cannot be assessed as given
    |-- RuleError                ValueError    a file of power rules has a wrong row, or a rule is not known
    |-- StudyError               ValueError    a study file has a wrong key or value
    |-- UsageError               ValueError    a command lacks an argument it needs
    `-- OutputError              OSError       results cannot be written (exit code 4)

A message has at most four lines: what is wrong and where, then the details, the allowed range and the remedy as lines
of their own. `str(error)` is exactly what the terminal shows.
"""


class FellspanError(Exception):
    """Base of all errors raised on purpose.

    Parameters
    ----------
    what
        First line: what is wrong, and where, with the offending value in it.
    details
        At most three more lines: values, allowed range, remedy. None are dropped and none may be empty.
    """

    exit_code = 2

    def __init__(self, what: str, *details: str) -> None:
        super().__init__("\n  ".join((what, *details)))
        self.what = what
        self.details = details


class QuantityError(FellspanError, ValueError):
    """A text is not the quantity that was asked for."""


class CoordinateError(FellspanError, ValueError):
    """A text or a pair of numbers is not a position on Earth, or looks like a swapped one."""


class MagneticModelError(FellspanError, ValueError):
    """The World Magnetic Model does not cover the date."""


class TerrainError(FellspanError, ValueError):
    """Base of what can be wrong with terrain data."""


class RasterError(TerrainError):
    """A file cannot serve as an elevation raster."""


class TerrainGapError(TerrainError):
    """The rasters have no elevation on part of a path."""


class VerticalDatumError(TerrainError):
    """Heights of different vertical datums would be mixed."""


class SeamError(TerrainError):
    """Overlapping rasters disagree by more than their stated errors."""


class ObstacleFileError(TerrainError):
    """An obstacle or cover file has a row that cannot be used."""


class SurveyFileError(TerrainError):
    """A survey file has a row that cannot be used."""


class AntennaError(FellspanError, ValueError):
    """An antenna or a pattern file cannot be used as it is given."""


class LinkError(FellspanError, ValueError):
    """A link cannot be assessed as it is given."""


class RuleError(FellspanError, ValueError):
    """A file of power rules has a row that cannot be used, or a rule is named that no file holds."""


class StudyError(FellspanError, ValueError):
    """A study file has an unknown key, a wrong value or a missing one."""


class SitesFileError(FellspanError, ValueError):
    """A file of hubs, places or pairs cannot be read or has a row that cannot be used."""


class RunError(FellspanError, ValueError):
    """A long run cannot start or go on: its inputs changed, another run is at work, or the cluster is not as it must be."""


class MeasuredFileError(FellspanError, ValueError):
    """A file of what was measured of a link as built has an unknown key, a wrong value or a missing one."""


class UsageError(FellspanError, ValueError):
    """A command was not given what it needs."""


class OutputError(FellspanError, OSError):
    """Results cannot be written where they were asked for."""

    exit_code = 4
