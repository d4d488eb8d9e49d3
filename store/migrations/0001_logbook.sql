-- Schema 1. Values are unscaled SI; a comment gives the unit where the name does not.
-- 9e999 reads as infinity: "x < 9e999" keeps a value finite. SQLite stores NaN as NULL.

CREATE TABLE board (
  id       INTEGER PRIMARY KEY,
  name     TEXT NOT NULL UNIQUE CHECK (name <> ''),
  device_v REAL CHECK (device_v > 0 AND device_v < 9e999), -- V: the switch's rated voltage
  note     TEXT CHECK (note <> '')
) STRICT;

CREATE TABLE revision (
  id    INTEGER PRIMARY KEY,
  board INTEGER NOT NULL REFERENCES board,
  name  TEXT NOT NULL CHECK (name <> ''),
  note  TEXT CHECK (note <> ''),
  UNIQUE (board, name)
) STRICT;

-- What the converter was doing. NULL: not stated; zero is not stored, so that ifnull(x, 0) is unique.
CREATE TABLE operating_point (
  id           INTEGER PRIMARY KEY,
  bus_v        REAL CHECK (bus_v <> 0 AND abs(bus_v) < 9e999),
  current_a    REAL CHECK (current_a <> 0 AND abs(current_a) < 9e999),
  switching_hz REAL CHECK (switching_hz > 0 AND switching_hz < 9e999)
) STRICT;
CREATE UNIQUE INDEX operating_point_once
  ON operating_point (ifnull(bus_v, 0), ifnull(current_a, 0), ifnull(switching_hz, 0));

-- A sitting at the bench.
CREATE TABLE session (
  id   INTEGER PRIMARY KEY,
  name TEXT NOT NULL UNIQUE CHECK (name <> ''),
  note TEXT CHECK (note <> '')
) STRICT;

CREATE TABLE instrument (
  id  INTEGER PRIMARY KEY,
  idn TEXT NOT NULL UNIQUE CHECK (idn <> '') -- its answer to *IDN? (IEEE 488.2)
) STRICT;

-- seq is the order of logging in this file; id is the trial's identity in every file.
-- Times are RFC 3339 in UTC with nine decimals: text order is time order.
CREATE TABLE trial (
  seq             INTEGER PRIMARY KEY,
  id              TEXT NOT NULL UNIQUE CHECK (length(id) = 36),
  revision        INTEGER NOT NULL REFERENCES revision,
  session         INTEGER REFERENCES session,
  operating_point INTEGER REFERENCES operating_point,
  at              TEXT NOT NULL CHECK (length(at) = 30 AND substr(at, 30) = 'Z'),
  logged_at       TEXT NOT NULL CHECK (length(logged_at) = 30 AND substr(logged_at, 30) = 'Z'),
  network         TEXT NOT NULL CHECK (network IN ('bare', 'c', 'rc', 'rcd')),
  c               REAL CHECK (c > 0 AND c < 9e999),         -- F
  c_tol           REAL CHECK (c_tol > 0 AND c_tol < 1),     -- bound, as a fraction of c
  r               REAL CHECK (r > 0 AND r < 9e999),         -- ohm
  r_tol           REAL CHECK (r_tol > 0 AND r_tol < 1),     -- bound, as a fraction of r
  esr             REAL CHECK (esr > 0 AND esr < 9e999),     -- ohm: the capacitor's series resistance
  measured_c      REAL CHECK (measured_c > 0 AND measured_c < 9e999),     -- F, on a meter
  measured_c_u    REAL CHECK (measured_c_u > 0 AND measured_c_u < 9e999), -- F, standard uncertainty
  probe_c         REAL CHECK (probe_c > 0 AND probe_c < 9e999),           -- F
  part            TEXT CHECK (part <> ''),
  note            TEXT CHECK (note <> ''),
  CHECK ((c IS NOT NULL) = (network <> 'bare')),
  CHECK ((r IS NOT NULL) = (network IN ('rc', 'rcd'))),
  CHECK (c IS NOT NULL OR (c_tol IS NULL AND esr IS NULL AND measured_c IS NULL)),
  CHECK (r IS NOT NULL OR r_tol IS NULL),
  CHECK (measured_c IS NOT NULL OR measured_c_u IS NULL)
) STRICT;
CREATE INDEX trial_by_time ON trial (at);
CREATE INDEX trial_by_revision ON trial (revision, at);

-- One quantity of one trial as read. The quantity's name carries its unit: ring_hz, decay_s, peak_v, ...
CREATE TABLE reading (
  trial      INTEGER NOT NULL REFERENCES trial,
  quantity   TEXT NOT NULL CHECK (quantity <> ''),
  value      REAL NOT NULL CHECK (abs(value) < 9e999),
  u          REAL CHECK (u > 0 AND u < 9e999), -- standard uncertainty (k = 1)
  instrument INTEGER REFERENCES instrument,    -- NULL: a person typed it
  PRIMARY KEY (trial, quantity),
  CHECK (value > 0 OR quantity NOT IN ('ring_hz', 'decay_s', 'switching_hz'))
) STRICT, WITHOUT ROWID;

-- The single values behind a reading, n = 1, 2, 3, ... in the order read.
CREATE TABLE reading_repeat (
  trial    INTEGER NOT NULL,
  quantity TEXT NOT NULL,
  n        INTEGER NOT NULL CHECK (n >= 1),
  value    REAL NOT NULL CHECK (abs(value) < 9e999),
  PRIMARY KEY (trial, quantity, n),
  FOREIGN KEY (trial, quantity) REFERENCES reading
) STRICT, WITHOUT ROWID;

-- A captured edge, evenly sampled.
CREATE TABLE waveform (
  seq        INTEGER PRIMARY KEY,
  id         TEXT NOT NULL UNIQUE CHECK (length(id) = 36),
  trial      INTEGER NOT NULL REFERENCES trial,
  start_s    REAL NOT NULL CHECK (abs(start_s) < 9e999),                -- time of the first sample
  interval_s REAL NOT NULL CHECK (interval_s > 0 AND interval_s < 9e999),
  samples    BLOB NOT NULL,
  encoding   TEXT NOT NULL CHECK (encoding <> ''),                      -- how samples hold volts
  sha256     BLOB NOT NULL CHECK (length(sha256) = 32),                 -- of samples
  origin     TEXT CHECK (origin <> '')                                  -- the file or instrument it came from
) STRICT;
CREATE INDEX waveform_by_trial ON waveform (trial);

-- A trial marked as wrong. Two benches may each have struck the same trial: the first in time counts.
CREATE TABLE strike (
  seq     INTEGER PRIMARY KEY,
  id      TEXT NOT NULL UNIQUE CHECK (length(id) = 36),
  trial   INTEGER NOT NULL REFERENCES trial,
  at      TEXT NOT NULL CHECK (length(at) = 30 AND substr(at, 30) = 'Z'),
  because TEXT NOT NULL CHECK (trim(because) <> '')
) STRICT;
CREATE INDEX strike_by_trial ON strike (trial);

CREATE TRIGGER trial_stays BEFORE UPDATE ON trial BEGIN
  SELECT RAISE(ABORT, 'a trial is never changed: strike it with a reason and log it again'); END;
CREATE TRIGGER trial_kept BEFORE DELETE ON trial BEGIN
  SELECT RAISE(ABORT, 'a trial is never deleted: strike it with a reason'); END;
CREATE TRIGGER reading_stays BEFORE UPDATE ON reading BEGIN
  SELECT RAISE(ABORT, 'a reading is never changed: strike its trial with a reason and log it again'); END;
CREATE TRIGGER reading_kept BEFORE DELETE ON reading BEGIN
  SELECT RAISE(ABORT, 'a reading is never deleted: strike its trial with a reason'); END;
CREATE TRIGGER reading_repeat_stays BEFORE UPDATE ON reading_repeat BEGIN
  SELECT RAISE(ABORT, 'a repeat is never changed: strike its trial with a reason and log it again'); END;
CREATE TRIGGER reading_repeat_kept BEFORE DELETE ON reading_repeat BEGIN
  SELECT RAISE(ABORT, 'a repeat is never deleted: strike its trial with a reason'); END;
CREATE TRIGGER waveform_stays BEFORE UPDATE ON waveform BEGIN
  SELECT RAISE(ABORT, 'a waveform is never changed: strike its trial with a reason and log it again'); END;
CREATE TRIGGER waveform_kept BEFORE DELETE ON waveform BEGIN
  SELECT RAISE(ABORT, 'a waveform is never deleted: strike its trial with a reason'); END;
CREATE TRIGGER strike_stays BEFORE UPDATE ON strike BEGIN
  SELECT RAISE(ABORT, 'a strike is never changed: log the trial again if it was right'); END;
CREATE TRIGGER strike_kept BEFORE DELETE ON strike BEGIN
  SELECT RAISE(ABORT, 'a strike is never deleted: log the trial again if it was right'); END;

-- INSERT OR REPLACE would delete without asking the triggers above, unless recursive_triggers is on.
CREATE TRIGGER trial_once BEFORE INSERT ON trial
WHEN EXISTS (SELECT 1 FROM trial WHERE id = NEW.id OR seq = NEW.seq) BEGIN
  SELECT RAISE(ABORT, 'a trial is never replaced: strike it with a reason and log it again'); END;
CREATE TRIGGER reading_once BEFORE INSERT ON reading
WHEN EXISTS (SELECT 1 FROM reading WHERE trial = NEW.trial AND quantity = NEW.quantity) BEGIN
  SELECT RAISE(ABORT, 'a reading is never replaced: strike its trial with a reason and log it again'); END;
CREATE TRIGGER reading_repeat_once BEFORE INSERT ON reading_repeat
WHEN EXISTS (SELECT 1 FROM reading_repeat WHERE trial = NEW.trial AND quantity = NEW.quantity AND n = NEW.n) BEGIN
  SELECT RAISE(ABORT, 'a repeat is never replaced: strike its trial with a reason and log it again'); END;
CREATE TRIGGER waveform_once BEFORE INSERT ON waveform
WHEN EXISTS (SELECT 1 FROM waveform WHERE id = NEW.id OR seq = NEW.seq) BEGIN
  SELECT RAISE(ABORT, 'a waveform is never replaced: strike its trial with a reason and log it again'); END;
CREATE TRIGGER strike_once BEFORE INSERT ON strike
WHEN EXISTS (SELECT 1 FROM strike WHERE id = NEW.id OR seq = NEW.seq) BEGIN
  SELECT RAISE(ABORT, 'a strike is never replaced: log the trial again if it was right'); END;

-- The history as any SQL tool reads it; the package documentation describes every column.
CREATE VIEW trial_table AS
SELECT
  t.id AS id, b.name AS board, v.name AS revision,
  t.network AS network, t.c AS c, t.c_tol AS c_tol, t.r AS r, t.r_tol AS r_tol, t.probe_c AS probe_c,
  coalesce(p.bus_v, (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'bus_v')) AS bus_v,
  coalesce(p.current_a, (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'current_a')) AS current_a,
  coalesce(p.switching_hz, (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'switching_hz')) AS switching_hz,
  (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'ring_hz') AS ring_hz,
  (SELECT u FROM reading WHERE trial = t.seq AND quantity = 'ring_hz') AS ring_hz_u,
  (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'decay_s') AS decay_s,
  (SELECT u FROM reading WHERE trial = t.seq AND quantity = 'decay_s') AS decay_s_u,
  (SELECT value FROM reading WHERE trial = t.seq AND quantity = 'peak_v') AS peak_v,
  (SELECT u FROM reading WHERE trial = t.seq AND quantity = 'peak_v') AS peak_v_u,
  t.at AS at, t.part AS part, t.note AS note,
  (SELECT because FROM strike WHERE trial = t.seq ORDER BY at, id LIMIT 1) AS struck
FROM trial t
JOIN revision v ON v.id = t.revision
JOIN board b ON b.id = v.board
LEFT JOIN operating_point p ON p.id = t.operating_point;
