-- The logbook: what was measured, on which board, with which instruments, and what was decided.
--
-- Rows are only ever added; a correction is a new row that points at the old one.  Levels are
-- V RMS, gain is V/V, frequencies are hertz, times are UTC in ISO 8601.  9e999 reads as infinity,
-- so "x < 9e999" keeps infinity out; NOT NULL keeps NaN out, because SQLite stores NaN as NULL.

PRAGMA application_id = 1651403879;  -- 'bnlg'

-- Where rows come from.  Row 1 is this file; logbooks merged into it follow.
CREATE TABLE logbook (
  id INTEGER PRIMARY KEY,
  uuid TEXT NOT NULL UNIQUE CHECK (length(uuid) = 36),
  created_at TEXT NOT NULL,
  program TEXT NOT NULL
) STRICT;

-- Long texts, each kept once however many rows share it: settings, type B terms, budgets.
CREATE TABLE document (
  id INTEGER PRIMARY KEY,
  sha256 TEXT NOT NULL UNIQUE CHECK (length(sha256) = 64),
  body TEXT NOT NULL
) STRICT;

CREATE TABLE design (
  id INTEGER PRIMARY KEY,
  sha256 TEXT NOT NULL UNIQUE CHECK (length(sha256) = 64),
  name TEXT NOT NULL,
  revision TEXT NOT NULL,
  body TEXT NOT NULL
) STRICT;
CREATE INDEX design_by_name ON design (name, revision);

-- An instrument as it was used: another address or calibration is another row.
CREATE TABLE instrument (
  id INTEGER PRIMARY KEY,
  role TEXT NOT NULL CHECK (role IN ('source', 'input meter', 'output meter', 'scope')),
  identity TEXT NOT NULL,
  address TEXT NOT NULL,
  driver TEXT NOT NULL,
  calibration_due TEXT
) STRICT;
CREATE UNIQUE INDEX instrument_once
  ON instrument (
    identity, role, address, driver, calibration_due IS NULL, coalesce(calibration_due, '')
  );

CREATE TABLE sweep (
  id INTEGER PRIMARY KEY,
  uuid TEXT NOT NULL UNIQUE CHECK (length(uuid) = 36),
  origin INTEGER NOT NULL REFERENCES logbook (id),
  serial TEXT NOT NULL,
  kind TEXT NOT NULL CHECK (kind IN ('sweep', 'capture', 'through')),
  started_at TEXT NOT NULL CHECK (started_at GLOB '[0-9][0-9][0-9][0-9]-[0-9][0-9]-[0-9][0-9]T*'),
  design INTEGER REFERENCES design (id),
  reference TEXT NOT NULL CHECK (reference IN ('input', 'through', 'programmed')),
  source_ohm REAL CHECK (source_ohm >= 0 AND source_ohm < 9e999),
  simulated INTEGER NOT NULL CHECK (simulated IN (0, 1)),
  operator TEXT NOT NULL,
  lot TEXT NOT NULL,
  reason TEXT NOT NULL,
  note TEXT NOT NULL,
  settings INTEGER NOT NULL REFERENCES document (id),
  terms INTEGER NOT NULL REFERENCES document (id),
  capture_sha256 TEXT CHECK (length(capture_sha256) = 64),
  CHECK (serial <> '' OR kind = 'through')
) STRICT;
CREATE INDEX sweep_by_serial ON sweep (serial, started_at);
CREATE INDEX sweep_by_design ON sweep (design, started_at);
CREATE INDEX sweep_by_time ON sweep (started_at);
CREATE INDEX sweep_by_lot ON sweep (lot, started_at) WHERE lot <> '';
CREATE INDEX sweep_by_capture ON sweep (capture_sha256) WHERE capture_sha256 IS NOT NULL;

CREATE TABLE sweep_instrument (
  sweep INTEGER NOT NULL REFERENCES sweep (id),
  place INTEGER NOT NULL CHECK (place >= 0),
  instrument INTEGER NOT NULL REFERENCES instrument (id),
  PRIMARY KEY (sweep, place)
) STRICT, WITHOUT ROWID;
CREATE INDEX sweep_by_instrument ON sweep_instrument (instrument, sweep);

-- One row is one point; repeat is 0 for the point of the curve and 1, 2, ... for later checks of it.
CREATE TABLE point (
  sweep INTEGER NOT NULL REFERENCES sweep (id),
  position INTEGER NOT NULL CHECK (position >= 0),
  repeat INTEGER NOT NULL CHECK (repeat >= 0),
  frequency_hz REAL NOT NULL CHECK (frequency_hz > 0 AND frequency_hz < 9e999),
  level_vrms REAL NOT NULL CHECK (level_vrms >= 0 AND level_vrms < 9e999),
  input_vrms REAL CHECK (input_vrms >= 0 AND input_vrms < 9e999),
  output_vrms REAL CHECK (output_vrms >= 0 AND output_vrms < 9e999),
  gain REAL CHECK (gain >= 0 AND gain < 9e999),
  u_gain_rel REAL CHECK (u_gain_rel >= 0 AND u_gain_rel < 9e999),
  phase_deg REAL CHECK (abs(phase_deg) < 9e999),
  flags INTEGER NOT NULL CHECK (flags >= 0),
  PRIMARY KEY (sweep, position, repeat)
) STRICT, WITHOUT ROWID;

-- Only for points that were asked for more than once or whose reply was refused.
CREATE TABLE point_story (
  sweep INTEGER NOT NULL,
  position INTEGER NOT NULL,
  repeat INTEGER NOT NULL,
  attempts INTEGER NOT NULL CHECK (attempts >= 1),
  raw TEXT,
  PRIMARY KEY (sweep, position, repeat),
  FOREIGN KEY (sweep, position, repeat) REFERENCES point (sweep, position, repeat)
) STRICT, WITHOUT ROWID;

-- A sweep without this row is unfinished.  points counts the rows the sweep had, checks included.
CREATE TABLE sweep_end (
  sweep INTEGER PRIMARY KEY REFERENCES sweep (id),
  state TEXT NOT NULL CHECK (state IN ('complete', 'stopped', 'failed')),
  why TEXT NOT NULL,
  ended_at TEXT NOT NULL,
  points INTEGER NOT NULL CHECK (points >= 0)
) STRICT;

CREATE TRIGGER point_comes_before_the_end BEFORE INSERT ON point
WHEN EXISTS (SELECT 1 FROM sweep_end WHERE sweep = NEW.sweep)
BEGIN SELECT RAISE(ABORT, 'this sweep has ended: it takes no more points'); END;

-- What one extraction drew from one sweep.  number counts the extractions of a sweep, newest
-- highest.  record is the whole of it as JSON; the columns are its figures, for queries over many.
-- A figure with a bound is no value: "at least" or "at most" only.
CREATE TABLE figures (
  id INTEGER PRIMARY KEY,
  sweep INTEGER NOT NULL REFERENCES sweep (id),
  origin INTEGER NOT NULL REFERENCES logbook (id),
  number INTEGER NOT NULL CHECK (number >= 1),
  made_at TEXT NOT NULL,
  method TEXT NOT NULL,
  shape TEXT NOT NULL,
  settings INTEGER NOT NULL REFERENCES document (id),
  gain REAL CHECK (abs(gain) < 9e999),
  u_gain REAL CHECK (u_gain >= 0 AND u_gain < 9e999),
  bound_gain TEXT CHECK (bound_gain IN ('at least', 'at most')),
  gain_db REAL CHECK (abs(gain_db) < 9e999),
  u_gain_db REAL CHECK (u_gain_db >= 0 AND u_gain_db < 9e999),
  bound_gain_db TEXT CHECK (bound_gain_db IN ('at least', 'at most')),
  corner_hz REAL CHECK (abs(corner_hz) < 9e999),
  u_corner_hz REAL CHECK (u_corner_hz >= 0 AND u_corner_hz < 9e999),
  bound_corner_hz TEXT CHECK (bound_corner_hz IN ('at least', 'at most')),
  lower_corner_hz REAL CHECK (abs(lower_corner_hz) < 9e999),
  u_lower_corner_hz REAL CHECK (u_lower_corner_hz >= 0 AND u_lower_corner_hz < 9e999),
  bound_lower_corner_hz TEXT CHECK (bound_lower_corner_hz IN ('at least', 'at most')),
  bandwidth_hz REAL CHECK (abs(bandwidth_hz) < 9e999),
  u_bandwidth_hz REAL CHECK (u_bandwidth_hz >= 0 AND u_bandwidth_hz < 9e999),
  bound_bandwidth_hz TEXT CHECK (bound_bandwidth_hz IN ('at least', 'at most')),
  gbw_hz REAL CHECK (abs(gbw_hz) < 9e999),
  u_gbw_hz REAL CHECK (u_gbw_hz >= 0 AND u_gbw_hz < 9e999),
  bound_gbw_hz TEXT CHECK (bound_gbw_hz IN ('at least', 'at most')),
  peaking_db REAL CHECK (abs(peaking_db) < 9e999),
  u_peaking_db REAL CHECK (u_peaking_db >= 0 AND u_peaking_db < 9e999),
  bound_peaking_db TEXT CHECK (bound_peaking_db IN ('at least', 'at most')),
  peaking_hz REAL CHECK (abs(peaking_hz) < 9e999),
  u_peaking_hz REAL CHECK (u_peaking_hz >= 0 AND u_peaking_hz < 9e999),
  bound_peaking_hz TEXT CHECK (bound_peaking_hz IN ('at least', 'at most')),
  unity_hz REAL CHECK (abs(unity_hz) < 9e999),
  u_unity_hz REAL CHECK (u_unity_hz >= 0 AND u_unity_hz < 9e999),
  bound_unity_hz TEXT CHECK (bound_unity_hz IN ('at least', 'at most')),
  record TEXT NOT NULL,
  UNIQUE (sweep, number, origin)
) STRICT;

-- What was decided on one set of figures, against which limits, word by word.  number counts the
-- verdicts of a sweep over all its figures, newest highest.
CREATE TABLE verdict (
  id INTEGER PRIMARY KEY,
  figures INTEGER NOT NULL REFERENCES figures (id),
  origin INTEGER NOT NULL REFERENCES logbook (id),
  number INTEGER NOT NULL CHECK (number >= 1),
  made_at TEXT NOT NULL,
  overall TEXT NOT NULL
    CHECK (overall IN ('pass', 'conditional pass', 'conditional fail', 'invalid', 'fail')),
  design INTEGER REFERENCES design (id),
  budget INTEGER NOT NULL REFERENCES document (id),
  record TEXT NOT NULL,
  UNIQUE (figures, number, origin)
) STRICT;
CREATE INDEX verdict_by_word ON verdict (overall, figures);

-- Nothing is changed, nothing is deleted.
CREATE TRIGGER logbook_keeps_its_rows BEFORE DELETE ON logbook
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: logbook rows are never deleted'); END;
CREATE TRIGGER logbook_keeps_its_words BEFORE UPDATE ON logbook
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: logbook rows are never changed'); END;

CREATE TRIGGER document_keeps_its_rows BEFORE DELETE ON document
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: document rows are never deleted'); END;
CREATE TRIGGER document_keeps_its_words BEFORE UPDATE ON document
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: document rows are never changed'); END;

CREATE TRIGGER design_keeps_its_rows BEFORE DELETE ON design
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: design rows are never deleted'); END;
CREATE TRIGGER design_keeps_its_words BEFORE UPDATE ON design
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: design rows are never changed'); END;

CREATE TRIGGER instrument_keeps_its_rows BEFORE DELETE ON instrument
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: instrument rows are never deleted'); END;
CREATE TRIGGER instrument_keeps_its_words BEFORE UPDATE ON instrument
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: instrument rows are never changed'); END;

CREATE TRIGGER sweep_keeps_its_rows BEFORE DELETE ON sweep
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: sweep rows are never deleted'); END;
CREATE TRIGGER sweep_keeps_its_words BEFORE UPDATE ON sweep
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: sweep rows are never changed'); END;

CREATE TRIGGER sweep_instrument_keeps_its_rows BEFORE DELETE ON sweep_instrument
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: sweep_instrument rows are never deleted'); END;
CREATE TRIGGER sweep_instrument_keeps_its_words BEFORE UPDATE ON sweep_instrument
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: sweep_instrument rows are never changed'); END;

CREATE TRIGGER point_keeps_its_rows BEFORE DELETE ON point
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: point rows are never deleted'); END;
CREATE TRIGGER point_keeps_its_words BEFORE UPDATE ON point
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: point rows are never changed'); END;

CREATE TRIGGER point_story_keeps_its_rows BEFORE DELETE ON point_story
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: point_story rows are never deleted'); END;
CREATE TRIGGER point_story_keeps_its_words BEFORE UPDATE ON point_story
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: point_story rows are never changed'); END;

CREATE TRIGGER sweep_end_keeps_its_rows BEFORE DELETE ON sweep_end
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: sweep_end rows are never deleted'); END;
CREATE TRIGGER sweep_end_keeps_its_words BEFORE UPDATE ON sweep_end
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: sweep_end rows are never changed'); END;

CREATE TRIGGER figures_keeps_its_rows BEFORE DELETE ON figures
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: figures rows are never deleted'); END;
CREATE TRIGGER figures_keeps_its_words BEFORE UPDATE ON figures
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: figures rows are never changed'); END;

CREATE TRIGGER verdict_keeps_its_rows BEFORE DELETE ON verdict
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: verdict rows are never deleted'); END;
CREATE TRIGGER verdict_keeps_its_words BEFORE UPDATE ON verdict
BEGIN SELECT RAISE(ABORT, 'the logbook only grows: verdict rows are never changed'); END;
