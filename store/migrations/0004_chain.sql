-- Schema 4. Every trial, strike, decision and correction is an entry of one chain, each sealed with the one before; the
-- words of trials are indexed. Migration 4 also chains what is there: chain_old.go.

-- Logbooks whose entries are here: the first is this file, the others are where merged entries were first logged.
CREATE TABLE logbook (
  n  INTEGER PRIMARY KEY,
  id TEXT NOT NULL UNIQUE CHECK (length(id) = 36)
) STRICT;

-- A rating or a note as stated of a board (revision NULL) or of a revision: at first, or in correction of what was on file. The
-- latest stands in board and revision. One that states neither puts the board or the revision on file.
CREATE TABLE correction (
  seq      INTEGER PRIMARY KEY,
  id       TEXT NOT NULL UNIQUE CHECK (length(id) = 36),
  board    INTEGER NOT NULL REFERENCES board,
  revision INTEGER REFERENCES revision,
  at       TEXT CHECK (length(at) = 30 AND substr(at, 30) = 'Z'), -- NULL: before schema 4, which noted no time
  device_v REAL CHECK (device_v > 0 AND device_v < 9e999),        -- V: the switch's rated voltage; NULL: not stated
  note     TEXT CHECK (note <> ''),
  CHECK (revision IS NULL OR device_v IS NULL)
) STRICT;
CREATE INDEX correction_by_board ON correction (board, revision);

-- link is the SHA-256 of the entry's text and the link before; place.seal in chain.go says of what text.
CREATE TABLE chain (
  seq  INTEGER PRIMARY KEY,                                                        -- 1, 2, 3, ... in the order of logging
  kind TEXT NOT NULL CHECK (kind IN ('trial', 'strike', 'decision', 'correction')), -- the entry's table
  row  INTEGER NOT NULL,                                                            -- its seq in that table
  link BLOB NOT NULL CHECK (length(link) = 32)
) STRICT;

-- Where a merged entry was first logged, and its place in the chain there.
CREATE TABLE origin (
  chain    INTEGER PRIMARY KEY REFERENCES chain,
  logbook  INTEGER NOT NULL REFERENCES logbook,
  seq      INTEGER NOT NULL CHECK (seq >= 1),
  previous BLOB NOT NULL CHECK (length(previous) = 32),
  link     BLOB NOT NULL CHECK (length(link) = 32)
) STRICT;
CREATE INDEX origin_by_place ON origin (logbook, seq);

-- The words of names, by 4 times the row's number: and of boards 0, revisions 1, instruments 2 more.
CREATE VIRTUAL TABLE name_word USING fts5 (name, content = '', tokenize = 'unicode61');
CREATE TRIGGER board_word AFTER INSERT ON board BEGIN
  INSERT INTO name_word (rowid, name) VALUES (4 * NEW.id, NEW.name); END;
CREATE TRIGGER revision_word AFTER INSERT ON revision BEGIN
  INSERT INTO name_word (rowid, name) VALUES (4 * NEW.id + 1, NEW.name); END;
CREATE TRIGGER instrument_word AFTER INSERT ON instrument BEGIN
  INSERT INTO name_word (rowid, name) VALUES (4 * NEW.id + 2, NEW.idn); END;
INSERT INTO name_word (rowid, name) SELECT 4 * id, name FROM board;
INSERT INTO name_word (rowid, name) SELECT 4 * id + 1, name FROM revision;
INSERT INTO name_word (rowid, name) SELECT 4 * id + 2, idn FROM instrument;

-- The words of trials, a stretch of trials at a time; those after the last stretch are not in it yet.
CREATE VIRTUAL TABLE trial_word USING fts5 (part, note, content = '', columnsize = 0, tokenize = 'unicode61');
CREATE TABLE stretch (
  last   INTEGER PRIMARY KEY, -- trial.seq of its last trial; its first follows the stretch before
  oldest TEXT NOT NULL,       -- the least and the greatest trial.at in it
  newest TEXT NOT NULL
) STRICT;

CREATE TRIGGER logbook_stays BEFORE UPDATE ON logbook BEGIN
  SELECT RAISE(ABORT, 'a logbook keeps its id'); END;
CREATE TRIGGER logbook_kept BEFORE DELETE ON logbook BEGIN
  SELECT RAISE(ABORT, 'a logbook keeps its id'); END;
CREATE TRIGGER correction_stays BEFORE UPDATE ON correction BEGIN
  SELECT RAISE(ABORT, 'a correction is never changed: correct the board again'); END;
CREATE TRIGGER correction_kept BEFORE DELETE ON correction BEGIN
  SELECT RAISE(ABORT, 'a correction is never deleted: correct the board again'); END;
CREATE TRIGGER correction_once BEFORE INSERT ON correction
WHEN EXISTS (SELECT 1 FROM correction WHERE id = NEW.id OR seq = NEW.seq) BEGIN
  SELECT RAISE(ABORT, 'a correction is never replaced: correct the board again'); END;
CREATE TRIGGER chain_stays BEFORE UPDATE ON chain BEGIN
  SELECT RAISE(ABORT, 'the chain of entries is never changed'); END;
CREATE TRIGGER chain_kept BEFORE DELETE ON chain BEGIN
  SELECT RAISE(ABORT, 'the chain of entries is never shortened'); END;
CREATE TRIGGER chain_once BEFORE INSERT ON chain WHEN EXISTS (SELECT 1 FROM chain WHERE seq = NEW.seq) BEGIN
  SELECT RAISE(ABORT, 'the chain of entries is never changed'); END;
CREATE TRIGGER origin_stays BEFORE UPDATE ON origin BEGIN
  SELECT RAISE(ABORT, 'the origin of an entry is never changed'); END;
CREATE TRIGGER origin_kept BEFORE DELETE ON origin BEGIN
  SELECT RAISE(ABORT, 'the origin of an entry is never deleted'); END;
CREATE TRIGGER origin_once BEFORE INSERT ON origin WHEN EXISTS (SELECT 1 FROM origin WHERE chain = NEW.chain) BEGIN
  SELECT RAISE(ABORT, 'the origin of an entry is never changed'); END;
