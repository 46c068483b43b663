-- Pairs of occurrences that may tell one event, as the search for doubles
-- found them last (state "doubles": the change up to which it looked). Made
-- anew by each search.
CREATE TABLE double (
  a           INTEGER NOT NULL REFERENCES occurrence(key),
  b           INTEGER NOT NULL REFERENCES occurrence(key),
  probability REAL NOT NULL,
  evidence    TEXT NOT NULL, -- JSON
  PRIMARY KEY (a, b),
  CHECK (a < b)
) WITHOUT ROWID;
CREATE INDEX double_b ON double(b);

-- What people decided about pairs. It outlives the search.
CREATE TABLE double_decision (
  a    INTEGER NOT NULL REFERENCES occurrence(key),
  b    INTEGER NOT NULL REFERENCES occurrence(key),
  same INTEGER NOT NULL, -- 1: one event; 0: two events
  who  TEXT NOT NULL,
  at   TEXT NOT NULL, -- RFC 3339
  note TEXT NOT NULL,
  PRIMARY KEY (a, b),
  CHECK (a < b)
) WITHOUT ROWID;
CREATE INDEX double_decision_b ON double_decision(b);

-- References that a person removed, without any of their content. The same
-- reference read again is not stored.
CREATE TABLE removed (
  source TEXT NOT NULL,
  id     TEXT NOT NULL,
  key    INTEGER NOT NULL UNIQUE, -- that it had, for what is derived from it
  change INTEGER NOT NULL UNIQUE,
  who    TEXT NOT NULL,
  at     TEXT NOT NULL,
  note   TEXT NOT NULL,
  PRIMARY KEY (source, id)
) WITHOUT ROWID;
