"""Names in the logbook's file, kept in one place: a mistyped table must not become a new one."""

from typing import Final

APPLICATION_ID: Final = 0x626E6C67
MIGRATION_SET: Final = "benchlog"

MIGRATIONS: Final = "_sqlite_migrations"
LOGBOOK: Final = "logbook"
DOCUMENT: Final = "document"
DESIGN: Final = "design"
INSTRUMENT: Final = "instrument"
SWEEP: Final = "sweep"
SWEEP_INSTRUMENT: Final = "sweep_instrument"
POINT: Final = "point"
POINT_STORY: Final = "point_story"
SWEEP_END: Final = "sweep_end"
FIGURES: Final = "figures"
VERDICT: Final = "verdict"

# Every table that holds results or what they rest on; each refuses UPDATE and DELETE.
KEPT_TABLES: Final = (
    LOGBOOK,
    DOCUMENT,
    DESIGN,
    INSTRUMENT,
    SWEEP,
    SWEEP_INSTRUMENT,
    POINT,
    POINT_STORY,
    SWEEP_END,
    FIGURES,
    VERDICT,
)

# The row of table "logbook" that stands for this file itself.
THIS_LOGBOOK: Final = 1
