/**
 * The first schema. STRICT tables, and every REAL column NOT NULL with its range: SQLite stores NaN as NULL, so that these
 * two rules together keep anything that is not a number out. An optional number has a flag beside it.
 */
export const FIRST_SCHEMA = `
CREATE TABLE files (
  id INTEGER PRIMARY KEY,
  feed TEXT NOT NULL,
  path TEXT NOT NULL,
  path_bytes TEXT NOT NULL,
  revision INTEGER NOT NULL CHECK (revision >= 1),
  -- The last revision of the path that could be read: what it says counts.
  standing INTEGER NOT NULL CHECK (standing IN (0, 1)),
  sha256 TEXT NOT NULL,
  bytes INTEGER NOT NULL CHECK (bytes >= 0),
  signature TEXT NOT NULL,
  taken_in_at TEXT NOT NULL,
  row_count INTEGER NOT NULL,
  stored INTEGER NOT NULL CHECK (stored >= 0),
  same INTEGER NOT NULL CHECK (same >= 0),
  revised INTEGER NOT NULL CHECK (revised >= 0),
  quarantined INTEGER NOT NULL CHECK (quarantined >= 0),
  fault TEXT,
  UNIQUE (feed, path_bytes, revision),
  CHECK (row_count = stored + same + revised + quarantined),
  CHECK (standing = 0 OR fault IS NULL)
) STRICT;
CREATE UNIQUE INDEX one_standing_revision ON files (feed, path_bytes) WHERE standing = 1;
CREATE INDEX files_by_time ON files (taken_in_at);

-- Reading that began and did not end: a file that kills the reader is found out.
CREATE TABLE readings_begun (
  feed TEXT NOT NULL,
  path_bytes TEXT NOT NULL,
  sha256 TEXT NOT NULL,
  times INTEGER NOT NULL CHECK (times >= 1),
  PRIMARY KEY (feed, path_bytes)
) STRICT, WITHOUT ROWID;

CREATE TABLE quarantine (
  id INTEGER PRIMARY KEY,
  file_id INTEGER NOT NULL REFERENCES files (id),
  line INTEGER,
  reason TEXT NOT NULL,
  at TEXT NOT NULL
) STRICT;
CREATE INDEX quarantine_by_time ON quarantine (at);
CREATE INDEX quarantine_by_file ON quarantine (file_id);

CREATE TABLE arrivals (
  id INTEGER PRIMARY KEY,
  key TEXT NOT NULL UNIQUE,
  pulsar TEXT NOT NULL,
  time_text TEXT NOT NULL,
  time_scale TEXT NOT NULL CHECK (time_scale IN ('UTC', 'TDB')),
  time_day INTEGER NOT NULL,
  time_fraction REAL NOT NULL CHECK (time_fraction >= 0 AND time_fraction < 1),
  uncertainty_us REAL NOT NULL CHECK (uncertainty_us > 0 AND uncertainty_us < 1e12),
  dispersion_removed INTEGER NOT NULL CHECK (dispersion_removed IN (0, 1)),
  frequency_mhz REAL NOT NULL,
  site TEXT NOT NULL,
  receiver TEXT NOT NULL,
  pulse_number INTEGER,
  signal_to_noise_given INTEGER NOT NULL CHECK (signal_to_noise_given IN (0, 1)),
  signal_to_noise REAL NOT NULL CHECK (abs(signal_to_noise) < 1e12),
  note TEXT,
  quality TEXT NOT NULL CHECK (quality IN ('ok', 'extrapolated', 'unusable')),
  quality_reasons TEXT NOT NULL,
  file_id INTEGER NOT NULL REFERENCES files (id),
  line INTEGER NOT NULL,
  revises INTEGER REFERENCES arrivals (id),
  status TEXT NOT NULL CHECK (status IN ('live', 'revised', 'withdrawn')),
  reason TEXT NOT NULL,
  CHECK (CASE dispersion_removed WHEN 1 THEN frequency_mhz = 0 ELSE frequency_mhz > 0 AND frequency_mhz < 1e12 END)
) STRICT;
CREATE INDEX arrivals_by_time ON arrivals (pulsar, time_day);
CREATE INDEX arrivals_by_file ON arrivals (file_id);

-- Absent for an arrival of unusable quality. Delays in seconds.
CREATE TABLE barycentred (
  arrival_id INTEGER PRIMARY KEY REFERENCES arrivals (id),
  tdb_day INTEGER NOT NULL,
  tdb_fraction REAL NOT NULL CHECK (tdb_fraction >= 0 AND tdb_fraction < 1),
  clock_s REAL NOT NULL CHECK (abs(clock_s) < 1e9),
  tdb_minus_tt_s REAL NOT NULL CHECK (abs(tdb_minus_tt_s) < 1),
  roemer_s REAL NOT NULL CHECK (abs(roemer_s) < 1e4),
  shapiro_s REAL NOT NULL CHECK (abs(shapiro_s) < 1),
  dispersion_s REAL NOT NULL CHECK (abs(dispersion_s) < 1e9),
  orbit_s REAL NOT NULL CHECK (abs(orbit_s) < 1e9)
) STRICT;

-- Every place where an arrival stands, its first one included.
CREATE TABLE sightings (
  file_id INTEGER NOT NULL REFERENCES files (id),
  line INTEGER NOT NULL,
  arrival_id INTEGER NOT NULL REFERENCES arrivals (id),
  PRIMARY KEY (file_id, line, arrival_id)
) STRICT, WITHOUT ROWID;
CREATE INDEX sightings_by_arrival ON sightings (arrival_id);

CREATE TABLE arrival_changes (
  id INTEGER PRIMARY KEY,
  arrival_id INTEGER NOT NULL REFERENCES arrivals (id),
  file_id INTEGER REFERENCES files (id),
  at TEXT NOT NULL,
  status TEXT NOT NULL CHECK (status IN ('live', 'revised', 'withdrawn')),
  reason TEXT NOT NULL
) STRICT;
CREATE INDEX arrival_changes_by_arrival ON arrival_changes (arrival_id);

CREATE TABLE pulsar_reports (
  pulsar TEXT PRIMARY KEY,
  basis TEXT NOT NULL,
  body TEXT NOT NULL CHECK (json_valid(body)),
  at TEXT NOT NULL
) STRICT;

CREATE TABLE events (
  id TEXT PRIMARY KEY,
  pulsar TEXT NOT NULL,
  detector_state TEXT NOT NULL CHECK (detector_state IN ('suspected', 'confirmed', 'withdrawn')),
  state TEXT NOT NULL CHECK (state IN ('suspected', 'confirmed', 'withdrawn', 'accepted', 'rejected')),
  epoch_mjd REAL NOT NULL CHECK (abs(epoch_mjd) < 1e6),
  revision INTEGER NOT NULL CHECK (revision >= 1),
  told INTEGER NOT NULL CHECK (told IN (0, 1)),
  body TEXT NOT NULL CHECK (json_valid(body)),
  created_at TEXT NOT NULL,
  changed_at TEXT NOT NULL,
  CHECK (state IN (detector_state, 'accepted', 'rejected'))
) STRICT;
CREATE INDEX events_by_change ON events (changed_at);

CREATE TABLE event_pictures (
  event_id TEXT PRIMARY KEY REFERENCES events (id) ON UPDATE CASCADE ON DELETE CASCADE,
  body TEXT NOT NULL CHECK (json_valid(body))
) STRICT;

CREATE TABLE event_changes (
  event_id TEXT NOT NULL REFERENCES events (id) ON UPDATE CASCADE ON DELETE CASCADE,
  revision INTEGER NOT NULL CHECK (revision >= 1),
  at TEXT NOT NULL,
  what TEXT NOT NULL,
  body TEXT NOT NULL CHECK (json_valid(body)),
  PRIMARY KEY (event_id, revision)
) STRICT;
CREATE INDEX event_changes_by_time ON event_changes (at);

CREATE TABLE former_ids (
  former_id TEXT PRIMARY KEY,
  event_id TEXT NOT NULL REFERENCES events (id) ON UPDATE CASCADE ON DELETE CASCADE,
  at TEXT NOT NULL
) STRICT;
CREATE INDEX former_ids_by_event ON former_ids (event_id);

CREATE TABLE verdicts (
  id INTEGER PRIMARY KEY,
  event_id TEXT NOT NULL REFERENCES events (id) ON UPDATE CASCADE,
  verdict TEXT NOT NULL CHECK (verdict IN ('accept', 'reject', 'reopen')),
  reviewer TEXT NOT NULL,
  note TEXT NOT NULL,
  at TEXT NOT NULL,
  revision INTEGER NOT NULL CHECK (revision >= 1)
) STRICT;
CREATE UNIQUE INDEX one_verdict_a_revision ON verdicts (event_id, revision);
CREATE TRIGGER verdicts_stay BEFORE DELETE ON verdicts BEGIN SELECT RAISE(ABORT, 'verdicts are never deleted'); END;

CREATE TABLE messages (
  message_id TEXT PRIMARY KEY,
  kind TEXT NOT NULL CHECK (kind IN ('event', 'digest', 'notice', 'test')),
  event_id TEXT REFERENCES events (id) ON UPDATE CASCADE,
  subject TEXT NOT NULL,
  in_reply_to TEXT,
  content TEXT NOT NULL,
  created_at TEXT NOT NULL
) STRICT;
CREATE INDEX messages_by_event ON messages (event_id);

CREATE TABLE outbox (
  id INTEGER PRIMARY KEY,
  message_id TEXT NOT NULL REFERENCES messages (message_id),
  recipient TEXT NOT NULL,
  state TEXT NOT NULL CHECK (state IN ('queued', 'attempting', 'delivered', 'refused', 'expired')),
  attempts INTEGER NOT NULL CHECK (attempts >= 0),
  due_at TEXT NOT NULL,
  last_error TEXT,
  possible_duplicate INTEGER NOT NULL CHECK (possible_duplicate IN (0, 1)),
  unknown_ends INTEGER NOT NULL CHECK (unknown_ends >= 0),
  delivered_at TEXT,
  UNIQUE (message_id, recipient),
  CHECK ((state = 'delivered') = (delivered_at IS NOT NULL))
) STRICT;
CREATE INDEX outbox_due ON outbox (due_at) WHERE state = 'queued';
CREATE INDEX outbox_unsettled ON outbox (recipient) WHERE state IN ('queued', 'attempting');
CREATE TRIGGER outbox_ends_are_final BEFORE UPDATE OF state ON outbox
WHEN OLD.state IN ('delivered', 'refused', 'expired') AND NEW.state <> OLD.state
BEGIN SELECT RAISE(ABORT, 'a settled message does not change its state'); END;

-- What was delivered after the copy was made that a restore brought back: it is not sent again.
CREATE TABLE delivered_before (
  message_id TEXT NOT NULL,
  recipient TEXT NOT NULL,
  -- The same Message-ID may come about again with other news, which must be sent.
  subject TEXT NOT NULL,
  delivered_at TEXT NOT NULL,
  PRIMARY KEY (message_id, recipient)
) STRICT, WITHOUT ROWID;

CREATE TABLE digests (
  civil_date TEXT PRIMARY KEY,
  message_id TEXT NOT NULL REFERENCES messages (message_id),
  at TEXT NOT NULL
) STRICT;

CREATE TABLE meta (
  key TEXT PRIMARY KEY,
  value TEXT NOT NULL
) STRICT;
`;
