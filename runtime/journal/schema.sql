-- Pastern's journal, version 2. An SQLite 3 database in WAL mode (synchronous FULL while the onboard program
-- writes it). Any SQLite tool reads it; write to it with nothing but the onboard program.
--
-- PRAGMA application_id = 1346458673 (0x50415431, "PAT1"): this is a journal.
-- PRAGMA user_version   = 2: the version of this schema. A program refuses every version but its own: a newer
-- one, and an older one too, since nothing here carries an old record over. Version 1 had no seals at first, and
-- commands without the key of who sent them.
-- Rule of change: whatever changes a table raises the version.
--
-- Unsigned 64-bit numbers (draw) are stored as the signed integer of the same bits. SHA-256 sums are lower-case
-- hex, 64 characters. Times ending in _utc are the computer's clock, for people only; nothing is computed from
-- them. Messages (BLOB columns named after a message) are protobuf, see proto/pastern/v1. What is not a number
-- in a return is NULL in its column. A seal is the SHA-256 of what the program relies on in its row, in the
-- encoding of runtime/journal/encoding.h; a row that does not match its seal is damaged or was changed by hand,
-- and the journal is refused.

CREATE TABLE sessions (
  session                 INTEGER PRIMARY KEY,      -- 1, 2, 3 ...; 0 gathers the walks outside sessions
  plan_text               TEXT NOT NULL,            -- the plan, text-format protobuf, as it was given
  robot_sha256            TEXT NOT NULL,            -- of the robot file's bytes
  start_policy_sha256     TEXT NOT NULL,            -- of the start policy file's bytes
  start_parameters_sha256 TEXT NOT NULL DEFAULT '', -- of the start policy's parameters, as in table parameters
  candidate_sha256        TEXT NOT NULL DEFAULT '', -- of the offered candidate's file, or empty
  software                TEXT NOT NULL DEFAULT '',
  begun_utc               TEXT NOT NULL DEFAULT (strftime('%Y-%m-%dT%H:%M:%SZ', 'now')),
  ended                   INTEGER NOT NULL DEFAULT 0 CHECK (ended IN (0, 1)),
  ended_utc               TEXT,
  verdict                 TEXT CHECK (verdict IN ('adopt', 'keep')),
  p_value                 REAL,                     -- one-sided sign-flip test, adapted against start policy
  pairs                   INTEGER,
  effect                  REAL,                     -- mean paired difference of returns
  effect_low              REAL,                     -- interval at interval_level
  effect_high             REAL,
  interval_level          REAL,
  words                   TEXT,
  verdict_message         BLOB,                     -- pastern.v1.Verdict: what counts; the columns repeat it
  seal                    TEXT NOT NULL             -- of plan_text to software, ended, verdict_message
);

-- Policy parameters that walked: little-endian IEEE 754 doubles in the policy file's order.
CREATE TABLE parameters (
  sha256 TEXT PRIMARY KEY,                          -- of bytes
  count  INTEGER NOT NULL,
  bytes  BLOB NOT NULL
) WITHOUT ROWID;

CREATE TABLE walks (
  session            INTEGER NOT NULL REFERENCES sessions (session),
  walk               INTEGER NOT NULL,              -- 1, 2, 3 ... within the session, void ones counted
  part               TEXT NOT NULL CHECK (part IN ('baseline', 'search', 'confirmation start',
                                                   'confirmation adapted', 'single')),
  batch              INTEGER NOT NULL,              -- of the adaptation operator
  place              INTEGER NOT NULL,              -- within the batch, from 0
  draw               INTEGER NOT NULL,              -- random stream of this walk
  outcome            TEXT NOT NULL CHECK (outcome IN ('completed', 'fell', 'left the lane', 'void')),
  void_reason        TEXT NOT NULL DEFAULT '',
  return_total       REAL,                          -- the sum of the next five, in return units
  return_forward     REAL,
  return_energy      REAL,
  return_drift       REAL,
  return_turn        REAL,
  return_fall        REAL,
  duration_s         REAL,
  distance_m         REAL,
  mean_speed_m_per_s REAL,
  energy_j           REAL,
  cost_of_transport  REAL,                          -- NULL when the robot did not move forward
  roll_max_rad       REAL,
  pitch_max_rad      REAL,
  winding_max_c      REAL,
  pack_min_v         REAL,
  trip_cause         TEXT,                          -- NULL when nothing tripped
  started_s          REAL,                          -- robot's own time since the session began
  parameters_sha256  TEXT NOT NULL REFERENCES parameters (sha256),
  finished_utc       TEXT NOT NULL DEFAULT (strftime('%Y-%m-%dT%H:%M:%SZ', 'now')),
  episode_message    BLOB NOT NULL,                 -- pastern.v1.Episode: what counts; the columns repeat it
  seal               TEXT NOT NULL,                 -- of session, walk, episode_message
  PRIMARY KEY (session, walk)
) WITHOUT ROWID;

-- State that a simulated robot carries from walk to walk (heat, charge), as of the last finished walk.
CREATE TABLE carried_state (
  one     INTEGER PRIMARY KEY CHECK (one = 1),
  session INTEGER NOT NULL,
  walk    INTEGER NOT NULL,
  bytes   BLOB NOT NULL,
  seal    TEXT NOT NULL                             -- of bytes
);

-- Small named values that outlive a restart, such as the gate's winding temperatures.
CREATE TABLE kept_values (
  name  TEXT PRIMARY KEY,
  bytes BLOB NOT NULL,
  seal  TEXT NOT NULL                               -- of name, bytes
) WITHOUT ROWID;

CREATE TABLE policies (
  sha256 TEXT PRIMARY KEY,                          -- of bytes
  bytes  BLOB NOT NULL                              -- a policy file as it is
) WITHOUT ROWID;

-- Which policy is current: the last row. Going back is another row.
CREATE TABLE adoptions (
  adoption      INTEGER PRIMARY KEY,
  policy_sha256 TEXT NOT NULL REFERENCES policies (sha256),
  who           TEXT NOT NULL,
  when_utc      TEXT NOT NULL,
  words         TEXT NOT NULL,
  seal          TEXT NOT NULL                       -- of policy_sha256 to words
);

-- Robot files whose first-start procedure an operator has read and confirmed.
CREATE TABLE first_starts (
  robot_sha256 TEXT PRIMARY KEY,
  who          TEXT NOT NULL,
  when_utc     TEXT NOT NULL,
  seal         TEXT NOT NULL                        -- of robot_sha256 to when_utc
) WITHOUT ROWID;

-- Commands already carried out: a repeated id of the same key gets the same answer and does nothing.
CREATE TABLE commands (
  client_key     TEXT NOT NULL,                     -- public key of who sent it, Z85; empty without keys
  id             TEXT NOT NULL,
  command_sha256 TEXT NOT NULL,                     -- of the command without id, baton and name of the sender
  answer_message BLOB NOT NULL,                     -- pastern.v1.Answer
  seal           TEXT NOT NULL,                     -- of client_key to answer_message
  PRIMARY KEY (client_key, id)
) WITHOUT ROWID;

-- Published messages that can be fetched for ever, by sequence number.
CREATE TABLE telemetry (
  sequence          INTEGER PRIMARY KEY,
  telemetry_message BLOB NOT NULL,                  -- pastern.v1.Telemetry
  seal              TEXT NOT NULL                   -- of sequence, telemetry_message
);

-- Trips, releases, resumptions and the like, in words.
CREATE TABLE notes (
  note    INTEGER PRIMARY KEY,
  session INTEGER NOT NULL,                         -- 0 outside sessions
  words   TEXT NOT NULL,
  at_utc  TEXT NOT NULL DEFAULT (strftime('%Y-%m-%dT%H:%M:%SZ', 'now')),
  seal    TEXT NOT NULL                             -- of session, words
);
