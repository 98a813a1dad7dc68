// The tables of an archive, as the first migration makes them. Later changes are migrations of their own:
// this text is frozen once a release has written an archive with it.
//
//   run ─┬─ segment ─┐
//        ├─ setup ───┼─ sample
//        └─ event    ┘
//
// Everything but the state of a run is written once. The triggers hold that even against another program
// with the file open, so that a sample once announced is never altered, whoever asks.

/** Marks the file as ours in SQLite's header (PRAGMA application_id): the letters NCUT. */
export const applicationId = 0x4e435554;

const tables = `
CREATE TABLE run (
  number INTEGER PRIMARY KEY AUTOINCREMENT,
  uuid TEXT NOT NULL UNIQUE CHECK (uuid <> ''),
  kind TEXT NOT NULL CHECK (kind IN ('pattern', 'reference', 'floor', 'trim', 'import')),
  state TEXT NOT NULL DEFAULT 'running' CHECK (state IN ('running', 'complete', 'interrupted', 'failed')),
  antenna_name TEXT NOT NULL,
  antenna_revision TEXT NOT NULL,
  range_name TEXT NOT NULL,
  started_wall_ms REAL NOT NULL,
  ended_wall_ms REAL,
  reason TEXT,
  plan_text TEXT NOT NULL,
  plan_json TEXT NOT NULL CHECK (json_valid(plan_json)),
  range_text TEXT NOT NULL,
  range_json TEXT NOT NULL CHECK (json_valid(range_json)),
  gain_reference_json TEXT CHECK (gain_reference_json IS NULL OR json_valid(gain_reference_json)),
  CHECK ((state = 'running') = (ended_wall_ms IS NULL)),
  CHECK (state <> 'running' OR reason IS NULL)
) STRICT;

CREATE TABLE segment (
  run INTEGER NOT NULL REFERENCES run (number),
  segment INTEGER NOT NULL CHECK (segment >= 1),
  reason TEXT NOT NULL,
  epoch_wall_ms REAL NOT NULL,
  epoch_monotonic_ms REAL NOT NULL,
  analyzer_json TEXT NOT NULL CHECK (json_valid(analyzer_json)),
  controller_json TEXT NOT NULL CHECK (json_valid(controller_json)),
  PRIMARY KEY (run, segment)
) STRICT;

CREATE TABLE setup (
  run INTEGER NOT NULL REFERENCES run (number),
  setup INTEGER NOT NULL CHECK (setup >= 1),
  points INTEGER NOT NULL CHECK (points >= 1),
  sweep_json TEXT NOT NULL CHECK (json_valid(sweep_json)),
  calibration_json TEXT NOT NULL CHECK (json_valid(calibration_json)),
  PRIMARY KEY (run, setup),
  UNIQUE (run, setup, points)
) STRICT;

-- The points stand in the key to the setup: traces that do not fit the grid they claim are refused.
CREATE TABLE sample (
  run INTEGER NOT NULL REFERENCES run (number),
  sequence INTEGER NOT NULL CHECK (sequence >= 1),
  segment INTEGER NOT NULL,
  setup INTEGER NOT NULL,
  points INTEGER NOT NULL,
  purpose TEXT NOT NULL CHECK (purpose IN ('cut', 'tie', 'closure', 'reference', 'repeat')),
  cut TEXT NOT NULL,
  target_json TEXT NOT NULL CHECK (json_valid(target_json)),
  axis TEXT NOT NULL,
  angle_deg REAL NOT NULL,
  component TEXT NOT NULL CHECK (component IN ('co', 'cross', 'left', 'right')),
  attempt INTEGER NOT NULL CHECK (attempt >= 1),
  start_monotonic_ms REAL NOT NULL,
  stop_monotonic_ms REAL NOT NULL CHECK (stop_monotonic_ms >= start_monotonic_ms),
  law_kind TEXT NOT NULL CHECK (law_kind = 'linear'),
  law_first_ms REAL NOT NULL,
  law_last_ms REAL NOT NULL CHECK (law_last_ms >= law_first_ms),
  track_json TEXT NOT NULL CHECK (json_valid(track_json)),
  traces BLOB NOT NULL,
  PRIMARY KEY (run, sequence),
  FOREIGN KEY (run, segment) REFERENCES segment (run, segment),
  FOREIGN KEY (run, setup, points) REFERENCES setup (run, setup, points)
) STRICT;

-- Events may come before the first segment is known, which is then 0.
CREATE TABLE event (
  id INTEGER PRIMARY KEY AUTOINCREMENT,
  run INTEGER NOT NULL REFERENCES run (number),
  segment INTEGER NOT NULL CHECK (segment >= 0),
  wall_ms REAL NOT NULL,
  monotonic_ms REAL NOT NULL,
  kind TEXT NOT NULL CHECK (kind <> ''),
  text TEXT NOT NULL,
  facts_json TEXT NOT NULL CHECK (json_valid(facts_json))
) STRICT;

CREATE INDEX event_by_run ON event (run, id);
`;

/** Rows that are written once: no update, no delete, and no INSERT OR REPLACE over a row that is there. */
function writtenOnce(table: string, same: string, words: string): string {
  return `
CREATE TRIGGER ${table}_not_updated BEFORE UPDATE ON ${table}
BEGIN SELECT RAISE(ABORT, '${words}'); END;
CREATE TRIGGER ${table}_not_deleted BEFORE DELETE ON ${table}
BEGIN SELECT RAISE(ABORT, '${words}'); END;
CREATE TRIGGER ${table}_not_replaced BEFORE INSERT ON ${table}
WHEN EXISTS (SELECT 1 FROM ${table} WHERE ${same})
BEGIN SELECT RAISE(ABORT, '${words}'); END;
`;
}

const runTriggers = `
CREATE TRIGGER run_frozen
BEFORE UPDATE OF number, uuid, kind, antenna_name, antenna_revision, range_name, started_wall_ms,
  plan_text, plan_json, range_text, range_json, gain_reference_json ON run
BEGIN SELECT RAISE(ABORT, 'what a run started with is never altered'); END;
CREATE TRIGGER run_final BEFORE UPDATE ON run WHEN OLD.state IN ('complete', 'failed')
BEGIN SELECT RAISE(ABORT, 'a run that is complete or failed stays so'); END;
CREATE TRIGGER sample_of_running_run BEFORE INSERT ON sample
WHEN (SELECT state FROM run WHERE number = NEW.run) <> 'running'
BEGIN SELECT RAISE(ABORT, 'a run that has ended takes no samples'); END;
`;

export const schemaV1 = [
  tables,
  writtenOnce('sample', 'run = NEW.run AND sequence = NEW.sequence', 'samples are never altered'),
  writtenOnce('segment', 'run = NEW.run AND segment = NEW.segment', 'segments are never altered'),
  writtenOnce('setup', 'run = NEW.run AND setup = NEW.setup', 'setups are never altered'),
  writtenOnce('event', 'id = NEW.id', 'events are never altered'),
  runTriggers,
].join('');
