CREATE INDEX entries_by_utc ON entry_rows (utc_us);
CREATE INDEX entries_by_about ON entry_rows (about);
