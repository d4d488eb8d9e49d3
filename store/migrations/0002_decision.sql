-- Schema 2. A decision is what was recommended, for which loop at which operating point, and the trials it rests on: what
-- is measured afterwards is held against it. Like a trial it is added and never changed, replaced or deleted.

CREATE TABLE decision (
  seq            INTEGER PRIMARY KEY,
  id             TEXT NOT NULL UNIQUE CHECK (length(id) = 36),
  revision       INTEGER NOT NULL REFERENCES revision,
  at             TEXT NOT NULL CHECK (length(at) = 30 AND substr(at, 30) = 'Z'), -- when it was made; RFC 3339 in UTC
  network        TEXT NOT NULL CHECK (network IN ('c', 'rc', 'rcd')),
  c              REAL NOT NULL CHECK (c > 0 AND c < 9e999),  -- F
  c_tol          REAL CHECK (c_tol > 0 AND c_tol < 1),       -- bound, as a fraction of c
  r              REAL CHECK (r > 0 AND r < 9e999),           -- ohm
  r_tol          REAL CHECK (r_tol > 0 AND r_tol < 1),       -- bound, as a fraction of r
  limit_v        REAL NOT NULL CHECK (limit_v > 0 AND limit_v < 9e999),  -- the peak it is to stay under
  peak_v         REAL NOT NULL CHECK (peak_v > 0 AND peak_v < 9e999),    -- the peak predicted
  peak_v_u       REAL CHECK (peak_v_u > 0 AND peak_v_u < 9e999),         -- its standard uncertainty (k = 1)
  peak_v_low     REAL NOT NULL CHECK (abs(peak_v_low) < 9e999),       -- its 95 % interval
  peak_v_high    REAL NOT NULL CHECK (peak_v_high >= peak_v_low AND peak_v_high < 9e999),
  damping_ratio  REAL CHECK (damping_ratio > 0 AND damping_ratio < 9e999), -- of the least damped pair
  loss_w         REAL CHECK (loss_w > 0 AND loss_w < 9e999),
  bus_v          REAL NOT NULL CHECK (bus_v > 0 AND bus_v < 9e999),               -- the operating point it was made for
  excitation_a   REAL NOT NULL CHECK (excitation_a >= 0 AND excitation_a < 9e999),
  switching_hz   REAL CHECK (switching_hz > 0 AND switching_hz < 9e999),
  inductance_h   REAL NOT NULL CHECK (inductance_h > 0 AND inductance_h < 9e999), -- the loop it was made for
  capacitance_f  REAL NOT NULL CHECK (capacitance_f > 0 AND capacitance_f < 9e999),
  resistance_ohm REAL CHECK (resistance_ohm > 0 AND resistance_ohm < 9e999),
  digest         TEXT NOT NULL CHECK (length(digest) = 64 AND digest NOT GLOB '*[^0-9a-f]*'), -- SHA-256 of its trials
  recommendation TEXT CHECK (json_valid(recommendation)),                         -- the whole answer, as JSON
  CHECK ((r IS NOT NULL) = (network IN ('rc', 'rcd'))),
  CHECK (r IS NOT NULL OR r_tol IS NULL)
) STRICT;
CREATE INDEX decision_by_time ON decision (at);
CREATE INDEX decision_by_revision ON decision (revision, at);

CREATE TABLE decision_trial (
  decision INTEGER NOT NULL REFERENCES decision,
  trial    INTEGER NOT NULL REFERENCES trial,
  PRIMARY KEY (decision, trial)
) STRICT, WITHOUT ROWID;

CREATE TRIGGER decision_stays BEFORE UPDATE ON decision BEGIN
  SELECT RAISE(ABORT, 'a decision is never changed: recommend again to make another'); END;
CREATE TRIGGER decision_kept BEFORE DELETE ON decision BEGIN
  SELECT RAISE(ABORT, 'a decision is never deleted: recommend again to make another'); END;
CREATE TRIGGER decision_once BEFORE INSERT ON decision
WHEN EXISTS (SELECT 1 FROM decision WHERE id = NEW.id OR seq = NEW.seq) BEGIN
  SELECT RAISE(ABORT, 'a decision is never replaced: recommend again to make another'); END;
CREATE TRIGGER decision_trial_stays BEFORE UPDATE ON decision_trial BEGIN
  SELECT RAISE(ABORT, 'what a decision rests on is never changed: recommend again to make another'); END;
CREATE TRIGGER decision_trial_kept BEFORE DELETE ON decision_trial BEGIN
  SELECT RAISE(ABORT, 'what a decision rests on is never deleted: recommend again to make another'); END;
CREATE TRIGGER decision_trial_once BEFORE INSERT ON decision_trial
WHEN EXISTS (SELECT 1 FROM decision_trial WHERE decision = NEW.decision AND trial = NEW.trial) BEGIN
  SELECT RAISE(ABORT, 'what a decision rests on is never replaced: recommend again to make another'); END;

-- The decisions as any SQL tool reads them; the package documentation describes every column.
CREATE VIEW decision_table AS
SELECT
  d.id AS id, b.name AS board, v.name AS revision,
  d.network AS network, d.c AS c, d.c_tol AS c_tol, d.r AS r, d.r_tol AS r_tol,
  d.limit_v AS limit_v, d.peak_v AS peak_v, d.peak_v_u AS peak_v_u, d.peak_v_low AS peak_v_low, d.peak_v_high AS peak_v_high,
  d.damping_ratio AS damping_ratio, d.loss_w AS loss_w,
  d.bus_v AS bus_v, d.excitation_a AS excitation_a, d.switching_hz AS switching_hz,
  d.inductance_h AS inductance_h, d.capacitance_f AS capacitance_f, d.resistance_ohm AS resistance_ohm,
  d.at AS at,
  (SELECT count(*) FROM decision_trial x WHERE x.decision = d.seq) AS trials,
  (SELECT count(*) FROM decision_trial x WHERE x.decision = d.seq
    AND EXISTS (SELECT 1 FROM strike k WHERE k.trial = x.trial)) AS struck,
  d.digest AS digest
FROM decision d
JOIN revision v ON v.id = d.revision
JOIN board b ON b.id = v.board;
