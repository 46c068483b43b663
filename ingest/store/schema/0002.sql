-- A tag carries the hash of its rule with all terms that the rule uses, so
-- that tagging again touches only what a change touches. Tags made before
-- have none and are made anew.
ALTER TABLE tag ADD COLUMN rule_hash TEXT NOT NULL DEFAULT '';

-- 1 where a narrative stops in mid-sentence: what it does not mention is not
-- known. The same test as corpus.Narrative.CutOff.
ALTER TABLE occurrence ADD COLUMN cut_off INTEGER NOT NULL DEFAULT 0;
UPDATE occurrence SET cut_off = 1 WHERE EXISTS (
  SELECT 1 FROM narrative n WHERE n.occurrence = occurrence.key
  AND (length(n.text) IN (115, 255, 1000, 2000, 4000, 32767) OR length(n.text) = 114 AND n.kind = 'remarks')
  AND substr(rtrim(n.text, ' ' || char(9) || char(10) || char(13)), -1) NOT IN ('.', '!', '?', '"', ')', ''));

-- What the narratives contradict themselves in, a line each.
ALTER TABLE chain ADD COLUMN doubts TEXT NOT NULL DEFAULT '';

-- What a rule book and engine of a version were made of: JSON, the hash of
-- each rule, and of all else under the name ''.
CREATE TABLE rulebook (
  version TEXT PRIMARY KEY,
  parts   TEXT NOT NULL
) WITHOUT ROWID;
