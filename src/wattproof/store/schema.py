"""What a session file looks like inside: its mark, its version and its tables."""

from typing import Final

APPLICATION_ID: Final = 0x57505246  # "WPRF", in the header of every session file (SQLite, pragma application_id)
VERSION: Final = (
    1  # of the schema, in the header too (pragma user_version); `migrations` leads here from any earlier one
)
PAGE_BYTES: Final = 1024  # what a page leaves unused nobody can check: half of one for each capture and each reading
SUFFIX: Final = ".wattproof"

SCHEMA: Final = (
    """CREATE TABLE record (
  seq INTEGER PRIMARY KEY,
  kind TEXT NOT NULL,
  run INTEGER REFERENCES record (seq),
  number INTEGER NOT NULL,
  at TEXT NOT NULL,
  body TEXT NOT NULL,
  hash TEXT NOT NULL CHECK (length(hash) = 64)
) STRICT""",
    "CREATE INDEX record_of_kind ON record (run, kind, number)",
    """CREATE TABLE content (
  seq INTEGER PRIMARY KEY REFERENCES record (seq),
  bytes BLOB NOT NULL
) STRICT""",
    """CREATE VIEW reading AS SELECT
  seq, run, number, at,
  body ->> '$.kept.mark.role' AS role,
  body ->> '$.kept.mark.at' AS point,
  body ->> '$.kept.mark.row' AS "row",
  body ->> '$.kept.reading.channel' AS channel,
  body ->> '$.kept.reading.state' AS state,
  body ->> '$.kept.reading.fundamental_hz.value' AS fundamental_hz,
  body ->> '$.kept.reading.level_vrms.value' AS level_vrms,
  body ->> '$.kept.reading.power_w.value' AS power_w,
  body ->> '$.kept.reading.thdn.value' AS thdn_ratio
FROM record WHERE kind = 'reading'""",
)
