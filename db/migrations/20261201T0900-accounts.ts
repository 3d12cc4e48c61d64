import { RUNTIME_ROLE } from '../connect.ts';
import type { Migration } from '../migrate.ts';

/** People, teams, memberships, sessions and the counters of failed sign-ins. */
export const accounts: Migration = {
  name: '20261201T0900-accounts',
  async up({ sql }) {
    await sql(`
      CREATE TABLE users (
        id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
        email text NOT NULL UNIQUE CHECK (email = lower(email)),
        name text NOT NULL,
        password_hash text NOT NULL,
        must_change_password boolean NOT NULL DEFAULT false,
        created_at timestamptz(3) NOT NULL DEFAULT now(),
        updated_at timestamptz NOT NULL DEFAULT now()
      );
      CREATE TABLE teams (
        id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
        name text NOT NULL,
        created_at timestamptz(3) NOT NULL DEFAULT now(),
        updated_at timestamptz NOT NULL DEFAULT now()
      );
      CREATE TABLE memberships (
        team_id uuid NOT NULL REFERENCES teams ON DELETE CASCADE,
        user_id uuid NOT NULL REFERENCES users ON DELETE CASCADE,
        role text NOT NULL CHECK (role IN ('viewer', 'designer', 'reviewer', 'admin')),
        created_at timestamptz(3) NOT NULL DEFAULT now(),
        updated_at timestamptz NOT NULL DEFAULT now(),
        PRIMARY KEY (team_id, user_id)
      );
      CREATE INDEX memberships_user ON memberships (user_id);
      CREATE TABLE sessions (
        id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
        user_id uuid NOT NULL REFERENCES users ON DELETE CASCADE,
        created_at timestamptz(3) NOT NULL DEFAULT now(),
        last_seen_at timestamptz NOT NULL DEFAULT now(),
        expires_at timestamptz NOT NULL
      );
      CREATE INDEX sessions_user ON sessions (user_id);
      CREATE INDEX sessions_expiry ON sessions (expires_at);
      -- one row per account or address and window; also limits other requests that can be abused
      CREATE TABLE rate_limits (
        key text NOT NULL,
        window_start timestamptz NOT NULL,
        count integer NOT NULL,
        PRIMARY KEY (key, window_start)
      );
      CREATE INDEX rate_limits_window ON rate_limits (window_start);
      GRANT SELECT, INSERT, UPDATE, DELETE ON users, teams, memberships, sessions, rate_limits TO ${RUNTIME_ROLE};
    `);
  },
  async down({ sql }) {
    await sql('DROP TABLE rate_limits, sessions, memberships, teams, users');
  },
};
