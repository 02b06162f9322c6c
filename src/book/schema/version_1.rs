//! Version 1: the chain of records, and the tables by which they are found.
//!
//! `record` and `payload` are the record. Every other table but `head`, `wiping` and `lease` repeats what stands in payloads so that it can be
//! found without reading them all; `check` derives each of those rows again from its payload and compares.

use super::Migration;

pub(super) const MIGRATION: Migration = Migration { version: 1, sql: SQL };

const SQL: &str = "
-- The chain: one row for everything recorded, never changed and never deleted. It holds no personal text.
CREATE TABLE record (
  seq    INTEGER PRIMARY KEY,                           -- place in the chain, counted from 1 without a gap
  kind   INTEGER NOT NULL,                              -- what was recorded; 1000 and over are personal
  digest BLOB    NOT NULL CHECK (length(digest) = 32),  -- SHA-256 of salt and payload
  link   BLOB    NOT NULL CHECK (length(link) = 32)     -- SHA-256 of the link before, seq, kind and digest
) STRICT;

-- What was recorded, as canonical bytes.
CREATE TABLE payload (
  seq   INTEGER PRIMARY KEY REFERENCES record (seq),    -- the record it belongs to
  salt  BLOB    NOT NULL CHECK (length(salt) = 16),     -- drawn for this record alone
  bytes BLOB    NOT NULL                                -- canonical bytes
) STRICT;

-- Runs, for lists.
CREATE TABLE run (
  seq         INTEGER PRIMARY KEY REFERENCES record (seq), -- the record that began it
  number      INTEGER NOT NULL UNIQUE,                  -- 7 for R0007
  orifice     TEXT    NOT NULL,                         -- name of the orifice as given
  orifice_key TEXT    NOT NULL,                         -- the same in lower case
  gas         INTEGER NOT NULL,                         -- 1 oxygen, 2 air, 3 nitrogen, 4 helium
  purpose     INTEGER NOT NULL,                         -- 1 acceptance, 2 as-found, 3 as-left, 4 check
  taken       TEXT    NOT NULL,                         -- when it was taken, RFC 3339 with the offset as given
  taken_s     INTEGER NOT NULL,                         -- the same in seconds since 1970-01-01T00:00:00Z
  technician  TEXT,                                     -- who took it
  origin      INTEGER NOT NULL,                         -- 1 imported, 2 entered, 3 logged
  source      BLOB                                      -- SHA-256 of the files of an imported run
) STRICT;
CREATE UNIQUE INDEX run_source  ON run (source) WHERE source IS NOT NULL;
CREATE INDEX        run_orifice ON run (orifice_key, taken_s, number);
CREATE INDEX        run_entered ON run (number) WHERE origin <> 1;

-- Every record of a run, in order of seq: its header, readings, files, corrections, judgements.
CREATE TABLE of_run (
  seq  INTEGER PRIMARY KEY REFERENCES record (seq),     -- the record
  run  INTEGER NOT NULL,                                -- number of the run
  kind INTEGER NOT NULL                                 -- kind of the record
) STRICT;
CREATE INDEX of_run_run ON of_run (run, seq);

-- Decisions, for lists; the latest of a run is the one that holds.
CREATE TABLE decision (
  seq            INTEGER PRIMARY KEY REFERENCES record (seq), -- the record
  run            INTEGER NOT NULL,                      -- number of the run
  verdict        INTEGER NOT NULL,                      -- 1 pass, 2 fail, 3 undecided, 4 none
  method         INTEGER NOT NULL,                      -- revision of the method
  ip_pa          REAL,                                  -- nominal intermediate pressure, Pa over ambient
  flow_l_min     REAL,                                  -- flow there, L/min STPD of gas of 20 °C
  expanded_l_min REAL,                                  -- its expanded uncertainty at 95 %, L/min
  decided        TEXT    NOT NULL                       -- when, RFC 3339 with its offset
) STRICT;
CREATE INDEX decision_run ON decision (run, seq);

-- Certificates whose number was given out, for lists.
CREATE TABLE certificate (
  seq      INTEGER PRIMARY KEY REFERENCES record (seq), -- the record
  number   TEXT    NOT NULL,                            -- its number as printed
  key      TEXT    NOT NULL UNIQUE,                     -- the same in lower case
  year     INTEGER NOT NULL,                            -- the year of its number
  counter  INTEGER NOT NULL,                            -- the running part of its number
  run      INTEGER NOT NULL,                            -- number of the run it rests on
  as_found INTEGER,                                     -- number of the run before the work, where there is one
  orifice  TEXT    NOT NULL,                            -- name of the orifice as given
  amends   TEXT,                                        -- key of the certificate it amends or replaces
  replaces INTEGER,                                     -- 1 where it replaces that one, 0 where it amends it
  issued   TEXT    NOT NULL                             -- when, RFC 3339 with its offset
) STRICT;
CREATE INDEX        certificate_run    ON certificate (run, seq);
CREATE UNIQUE INDEX certificate_amends ON certificate (amends) WHERE amends IS NOT NULL;

-- Certificates whose files were written.
CREATE TABLE certificate_files (
  seq         INTEGER PRIMARY KEY REFERENCES record (seq), -- the record that says so
  certificate INTEGER NOT NULL UNIQUE REFERENCES record (seq), -- the record of the certificate
  pdf         BLOB    NOT NULL CHECK (length(pdf) = 32), -- SHA-256 of the PDF
  xml         BLOB    NOT NULL CHECK (length(xml) = 32)  -- SHA-256 of the XML
) STRICT;

-- Entries of the registers; the highest revision of a key is the one that holds.
CREATE TABLE register (
  seq      INTEGER PRIMARY KEY REFERENCES record (seq), -- the record
  register INTEGER NOT NULL,                            -- 1 orifice, 2 instrument, 3 first stage, 4 acceptance, 5 shop, 6 diver
  key      TEXT    NOT NULL,                            -- name in lower case
  id       TEXT    NOT NULL,                            -- name as given
  revision INTEGER NOT NULL                             -- counted from 1
) STRICT;
CREATE UNIQUE INDEX register_key ON register (register, key, revision);

-- Sessions, for lists. Personal: a row goes with the payload it repeats.
CREATE TABLE session (
  seq       INTEGER PRIMARY KEY REFERENCES record (seq), -- the record that began it
  number    INTEGER NOT NULL UNIQUE,                    -- 7 for S0007
  diver     TEXT    NOT NULL,                           -- code of the diver as given
  diver_key TEXT    NOT NULL,                           -- the same in lower case
  place     INTEGER NOT NULL,                           -- 1 couch, 2 pool
  kept      INTEGER NOT NULL,                           -- how the loop is kept at first: 1 sealed, 2 held, 3 topped
  taken     TEXT    NOT NULL,                           -- when it was begun, RFC 3339 with the offset as given
  recorded  TEXT    NOT NULL,                           -- when it was recorded, RFC 3339 with its offset
  origin    INTEGER NOT NULL,                           -- 1 imported, 2 entered, 3 logged
  first_s   REAL,                                       -- earliest reading, s on the time column
  last_s    REAL,                                       -- latest reading, s on the time column
  cells     INTEGER NOT NULL,                           -- oxygen cells
  readings  INTEGER,                                    -- rows of readings; none when it was begun without them
  source    BLOB                                        -- SHA-256 of the files of an imported session
) STRICT;
CREATE UNIQUE INDEX session_source ON session (source) WHERE source IS NOT NULL;
CREATE INDEX        session_diver  ON session (diver_key, number);

-- Every record of a session, in order of seq: its header, readings, line, files, what was left out.
CREATE TABLE of_session (
  seq     INTEGER PRIMARY KEY REFERENCES record (seq),  -- the record
  session INTEGER NOT NULL,                             -- number of the session
  kind    INTEGER NOT NULL                              -- kind of the record
) STRICT;
CREATE INDEX of_session_session ON of_session (session, seq);
CREATE INDEX of_session_kind    ON of_session (session, kind, seq);

-- Sessions that were recorded row by row and are complete, for lists. Personal, as session is.
CREATE TABLE session_finished (
  seq      INTEGER PRIMARY KEY REFERENCES record (seq), -- the record that says so
  session  INTEGER NOT NULL UNIQUE,                     -- number of the session
  cells    INTEGER NOT NULL,                            -- oxygen cells
  readings INTEGER NOT NULL,                            -- rows of readings that stand
  first_s  REAL,                                        -- earliest reading, s on the time column
  last_s   REAL                                         -- latest reading, s on the time column
) STRICT;

-- What was left out of sessions, for lists.
CREATE TABLE session_left_out (
  seq     INTEGER PRIMARY KEY REFERENCES record (seq),  -- the record
  session INTEGER NOT NULL,                             -- number of the session
  whole   INTEGER NOT NULL,                             -- 1 for the whole session, 0 for a stretch of it
  from_s  REAL,                                         -- first second of the stretch on the time column
  to_s    REAL                                          -- last second of the stretch
) STRICT;
CREATE INDEX session_left_out_session ON session_left_out (session);

-- Numbers of erased sessions: they stay used.
CREATE TABLE session_erased (
  number  INTEGER PRIMARY KEY,                          -- 7 for S0007
  erasure INTEGER NOT NULL REFERENCES record (seq)      -- the record that says when and why
) STRICT;

-- Records whose payload was erased.
CREATE TABLE erased (
  seq     INTEGER PRIMARY KEY REFERENCES record (seq),  -- the record without its payload
  erasure INTEGER NOT NULL REFERENCES record (seq)      -- the record that says when and why
) STRICT;

-- The end of the chain as it stood after the last transaction: one row, written anew with each.
CREATE TABLE head (
  one  INTEGER PRIMARY KEY CHECK (one = 1),             -- always 1
  seq  INTEGER NOT NULL,                                -- last place in the chain
  link BLOB    NOT NULL CHECK (length(link) = 32)       -- its link
) STRICT;

-- One row while an erasure has yet to be carried through to the file and its log.
CREATE TABLE wiping (
  one INTEGER PRIMARY KEY CHECK (one = 1)               -- always 1
) STRICT;

-- Who holds the ports of a run or session that is being logged: written anew all the time, no part of the record.
CREATE TABLE lease (
  what    INTEGER NOT NULL CHECK (what IN (1, 2)),      -- 1 run, 2 session
  number  INTEGER NOT NULL,                             -- its number
  holder  BLOB    NOT NULL CHECK (length(holder) = 16), -- drawn by the process that logs it
  host    TEXT    NOT NULL,                             -- name of the machine it runs on
  process INTEGER NOT NULL,                             -- its number there
  beat_ms INTEGER NOT NULL,                             -- when it was last heard of, ms since 1970-01-01T00:00:00Z
  PRIMARY KEY (what, number)
) STRICT, WITHOUT ROWID;

-- Nothing recorded is changed, whatever the form of the statement.
CREATE TRIGGER record_stays    BEFORE UPDATE ON record   BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER payload_stays   BEFORE UPDATE ON payload  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER run_stays       BEFORE UPDATE ON run      BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER of_run_stays    BEFORE UPDATE ON of_run   BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER decision_stays  BEFORE UPDATE ON decision BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER certificate_stays BEFORE UPDATE ON certificate
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER certificate_files_stays BEFORE UPDATE ON certificate_files
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER register_stays  BEFORE UPDATE ON register BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_stays          BEFORE UPDATE ON session
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER of_session_stays       BEFORE UPDATE ON of_session
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_finished_stays BEFORE UPDATE ON session_finished
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_left_out_stays BEFORE UPDATE ON session_left_out
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_erased_stays   BEFORE UPDATE ON session_erased
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER erased_stays    BEFORE UPDATE ON erased   BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;

CREATE TRIGGER record_kept     BEFORE DELETE ON record   BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER run_kept        BEFORE DELETE ON run      BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER of_run_kept     BEFORE DELETE ON of_run   BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER decision_kept   BEFORE DELETE ON decision BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER certificate_kept BEFORE DELETE ON certificate
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER certificate_files_kept BEFORE DELETE ON certificate_files
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_erased_kept BEFORE DELETE ON session_erased
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER erased_kept     BEFORE DELETE ON erased   BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
-- Only what an erasure names may go.
CREATE TRIGGER payload_kept    BEFORE DELETE ON payload
  WHEN NOT EXISTS (SELECT 1 FROM erased WHERE seq = OLD.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER register_kept   BEFORE DELETE ON register
  WHEN NOT EXISTS (SELECT 1 FROM erased WHERE seq = OLD.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_kept    BEFORE DELETE ON session
  WHEN NOT EXISTS (SELECT 1 FROM erased WHERE seq = OLD.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER of_session_kept BEFORE DELETE ON of_session
  WHEN NOT EXISTS (SELECT 1 FROM erased WHERE seq = OLD.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_finished_kept BEFORE DELETE ON session_finished
  WHEN NOT EXISTS (SELECT 1 FROM erased WHERE seq = OLD.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_left_out_kept BEFORE DELETE ON session_left_out
  WHEN NOT EXISTS (SELECT 1 FROM erased WHERE seq = OLD.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;

-- Insertion that would replace (INSERT OR REPLACE deletes without asking the triggers above where recursive triggers
-- are off), and links out of order.
CREATE TRIGGER record_follows  BEFORE INSERT ON record
  WHEN NEW.seq IS NOT (SELECT coalesce(max(seq), 0) + 1 FROM record)
  BEGIN SELECT RAISE(ABORT, 'a record comes after the last one'); END;
CREATE TRIGGER payload_new     BEFORE INSERT ON payload
  WHEN EXISTS (SELECT 1 FROM payload WHERE seq = NEW.seq) OR EXISTS (SELECT 1 FROM erased WHERE seq = NEW.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER run_new         BEFORE INSERT ON run
  WHEN EXISTS (SELECT 1 FROM run WHERE seq = NEW.seq OR number = NEW.number OR source = NEW.source)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER of_run_new      BEFORE INSERT ON of_run
  WHEN EXISTS (SELECT 1 FROM of_run WHERE seq = NEW.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER decision_new    BEFORE INSERT ON decision
  WHEN EXISTS (SELECT 1 FROM decision WHERE seq = NEW.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER certificate_new BEFORE INSERT ON certificate
  WHEN EXISTS (SELECT 1 FROM certificate WHERE seq = NEW.seq OR key = NEW.key)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER certificate_files_new BEFORE INSERT ON certificate_files
  WHEN EXISTS (SELECT 1 FROM certificate_files WHERE seq = NEW.seq OR certificate = NEW.certificate)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER register_new    BEFORE INSERT ON register
  WHEN EXISTS (SELECT 1 FROM register WHERE seq = NEW.seq
               OR (register = NEW.register AND key = NEW.key AND revision = NEW.revision))
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_new     BEFORE INSERT ON session
  WHEN EXISTS (SELECT 1 FROM session WHERE seq = NEW.seq OR number = NEW.number OR source = NEW.source)
    OR EXISTS (SELECT 1 FROM session_erased WHERE number = NEW.number)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER of_session_new  BEFORE INSERT ON of_session
  WHEN EXISTS (SELECT 1 FROM of_session WHERE seq = NEW.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_finished_new BEFORE INSERT ON session_finished
  WHEN EXISTS (SELECT 1 FROM session_finished WHERE seq = NEW.seq OR session = NEW.session)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_left_out_new BEFORE INSERT ON session_left_out
  WHEN EXISTS (SELECT 1 FROM session_left_out WHERE seq = NEW.seq)
  BEGIN SELECT RAISE(ABORT, 'the record is append-only'); END;
CREATE TRIGGER session_erased_new BEFORE INSERT ON session_erased
  WHEN EXISTS (SELECT 1 FROM session_erased WHERE number = NEW.number)
    OR NOT EXISTS (SELECT 1 FROM session WHERE number = NEW.number)
  BEGIN SELECT RAISE(ABORT, 'only a session that is there can be erased'); END;
-- Only personal records can be erased, each once.
CREATE TRIGGER erased_new      BEFORE INSERT ON erased
  WHEN EXISTS (SELECT 1 FROM erased WHERE seq = NEW.seq)
    OR NOT EXISTS (SELECT 1 FROM record WHERE seq = NEW.seq AND kind >= 1000)
  BEGIN SELECT RAISE(ABORT, 'only a personal record can be erased'); END;
";
