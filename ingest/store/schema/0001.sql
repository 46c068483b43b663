-- Files as they were named when read. A path is provenance, not identity.
CREATE TABLE file (
  key  INTEGER PRIMARY KEY,
  path TEXT NOT NULL UNIQUE,
  map  TEXT NOT NULL -- the field map that read it last
);

CREATE TABLE occurrence (
  key         INTEGER PRIMARY KEY AUTOINCREMENT,
  source      TEXT NOT NULL,
  id          TEXT NOT NULL,
  date        TEXT NOT NULL, -- ISO 8601, reduced precision; '' where unknown
  place       TEXT NOT NULL,
  country     TEXT NOT NULL,
  make        TEXT NOT NULL,
  model       TEXT NOT NULL,
  category    TEXT NOT NULL,
  engines     INTEGER NOT NULL, -- 0 where unknown
  engine_type TEXT NOT NULL,
  operation   TEXT NOT NULL,
  phase       TEXT NOT NULL,
  injury      TEXT NOT NULL,
  damage      TEXT NOT NULL,
  event       TEXT NOT NULL,
  rest        TEXT NOT NULL,    -- JSON: further aircraft, codes, extra
  kinds       TEXT NOT NULL,    -- kinds of its narratives, joined by commas
  usable      INTEGER NOT NULL, -- 1 where a narrative has words
  hash        BLOB NOT NULL,    -- SHA-256 of the canonical record
  file        INTEGER NOT NULL REFERENCES file(key),
  row         INTEGER NOT NULL,
  line        INTEGER NOT NULL,
  change      INTEGER NOT NULL,
  rulebook    TEXT NOT NULL,    -- version of book and engine behind its tags
  UNIQUE (source, id)
);
CREATE UNIQUE INDEX occurrence_change ON occurrence(change);

-- Long text stands in tables of its own, so that counting does not read it.
-- key is occurrence * 256 + n.
CREATE TABLE narrative (
  key        INTEGER PRIMARY KEY,
  occurrence INTEGER NOT NULL REFERENCES occurrence(key),
  kind       TEXT NOT NULL,
  text       TEXT NOT NULL
);
CREATE INDEX narrative_occurrence ON narrative(occurrence);

-- The row exactly as it was read.
CREATE TABLE raw (
  occurrence INTEGER PRIMARY KEY REFERENCES occurrence(key),
  bytes      BLOB NOT NULL
);

-- Tags without their quotes: these are the narrative's text at the span.
CREATE TABLE tag (
  occurrence INTEGER NOT NULL REFERENCES occurrence(key),
  n          INTEGER NOT NULL,
  factor     TEXT NOT NULL,
  assertion  TEXT NOT NULL,
  basis      TEXT NOT NULL,
  narrative  INTEGER NOT NULL,
  start      INTEGER NOT NULL,
  "end"      INTEGER NOT NULL,
  rule       TEXT NOT NULL,
  strength   REAL NOT NULL,
  side       TEXT NOT NULL,
  actor      TEXT NOT NULL,
  quantity   TEXT NOT NULL, -- JSON, '' where none
  PRIMARY KEY (occurrence, n)
) WITHOUT ROWID;

CREATE TABLE chain (
  occurrence INTEGER PRIMARY KEY REFERENCES occurrence(key),
  outcome    TEXT NOT NULL,
  broken_by  TEXT NOT NULL,
  links      TEXT NOT NULL -- JSON
);

-- Earlier contents of an occurrence, the first ones first.
CREATE TABLE revision (
  occurrence INTEGER NOT NULL REFERENCES occurrence(key),
  n          INTEGER NOT NULL,
  hash       BLOB NOT NULL,
  record     TEXT NOT NULL, -- canonical record
  raw        BLOB NOT NULL,
  file       INTEGER NOT NULL REFERENCES file(key),
  row        INTEGER NOT NULL,
  line       INTEGER NOT NULL,
  PRIMARY KEY (occurrence, n)
) WITHOUT ROWID;

CREATE TABLE set_aside (
  key    INTEGER PRIMARY KEY,
  file   INTEGER NOT NULL REFERENCES file(key),
  row    INTEGER NOT NULL,
  line   INTEGER NOT NULL,
  reason TEXT NOT NULL,
  size   INTEGER NOT NULL, -- bytes
  hash   BLOB NOT NULL,    -- SHA-256 of the raw row
  UNIQUE (hash, row)       -- the same row of the same file, read again
);
-- The raw row in parts of at most 1 MiB, since a row may be larger than memory.
CREATE TABLE set_aside_part (
  set_aside INTEGER NOT NULL REFERENCES set_aside(key),
  n         INTEGER NOT NULL,
  bytes     BLOB NOT NULL,
  PRIMARY KEY (set_aside, n)
);

CREATE TABLE exposure (
  covers     TEXT NOT NULL,
  period     TEXT NOT NULL,
  strata     TEXT NOT NULL, -- JSON object, keys sorted
  hours      REAL,          -- null where not given
  departures REAL,
  PRIMARY KEY (covers, period, strata)
) WITHOUT ROWID;

CREATE TABLE state (
  name  TEXT PRIMARY KEY,
  value TEXT NOT NULL
) WITHOUT ROWID;
INSERT INTO state VALUES ('change', '0');
