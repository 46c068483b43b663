-- How a file was read last, so that rows that were set aside can be read
-- again: its header row or rows, the field map as a file of one ('' where the
-- headers alone decide), the order of dates, and the source that was told.
ALTER TABLE file ADD COLUMN header BLOB NOT NULL DEFAULT x'';
ALTER TABLE file ADD COLUMN fields TEXT NOT NULL DEFAULT '';
ALTER TABLE file ADD COLUMN dates TEXT NOT NULL DEFAULT '';
ALTER TABLE file ADD COLUMN source TEXT NOT NULL DEFAULT '';
