import { RUNTIME_ROLE } from '../connect.ts';
import type { Migration } from '../migrate.ts';

/** Studies, uploaded files, observation sets, designs and jobs, with the guard of what never changes. */
export const studies: Migration = {
  name: '20261201T0910-studies',
  async up({ sql }) {
    await sql(`
      CREATE TABLE studies (
        id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
        team_id uuid NOT NULL REFERENCES teams ON DELETE CASCADE,
        name text NOT NULL,
        description text NOT NULL DEFAULT '',
        correlation jsonb NOT NULL,
        created_by uuid REFERENCES users ON DELETE SET NULL,
        created_at timestamptz(3) NOT NULL DEFAULT now(),
        updated_at timestamptz NOT NULL DEFAULT now()
      );
      CREATE INDEX studies_team ON studies (team_id, created_at DESC, id);
      CREATE INDEX studies_creator ON studies (created_by);

      CREATE TABLE stored_files (
        id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
        team_id uuid NOT NULL REFERENCES teams ON DELETE CASCADE,
        file_name text NOT NULL,
        byte_length bigint NOT NULL,
        sha256 text NOT NULL CHECK (sha256 ~ '^[0-9a-f]{64}$'),
        created_at timestamptz(3) NOT NULL DEFAULT now()
      );
      CREATE INDEX stored_files_team ON stored_files (team_id);
      CREATE TABLE stored_file_chunks (
        file_id uuid NOT NULL REFERENCES stored_files ON DELETE CASCADE,
        number integer NOT NULL,
        bytes bytea NOT NULL,
        PRIMARY KEY (file_id, number)
      );
      ALTER TABLE stored_file_chunks ALTER COLUMN bytes SET STORAGE EXTERNAL;

      CREATE TABLE observation_sets (
        id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
        team_id uuid NOT NULL REFERENCES teams ON DELETE CASCADE,
        study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
        file_id uuid NOT NULL REFERENCES stored_files,
        name text NOT NULL,
        format text NOT NULL CHECK (format IN ('csv', 'geojson')),
        crs text NOT NULL CHECK (crs IN ('lonlat-deg', 'plane-km')),
        mapping jsonb NOT NULL,
        rows_read integer NOT NULL,
        accepted integer NOT NULL,
        rejected_count integer NOT NULL,
        facts jsonb NOT NULL,
        columns_bundle bytea NOT NULL,
        created_by uuid REFERENCES users ON DELETE SET NULL,
        created_at timestamptz(3) NOT NULL DEFAULT now()
      );
      CREATE INDEX observation_sets_study ON observation_sets (study_id, created_at DESC, id);
      CREATE INDEX observation_sets_team ON observation_sets (team_id);
      CREATE INDEX observation_sets_file ON observation_sets (file_id);
      CREATE INDEX observation_sets_creator ON observation_sets (created_by);
      ALTER TABLE observation_sets ALTER COLUMN columns_bundle SET STORAGE EXTERNAL;

      -- deferred: rejected rows are written while the file is read, the set itself at the end of the same transaction
      CREATE TABLE rejected_rows (
        observation_set_id uuid NOT NULL REFERENCES observation_sets ON DELETE CASCADE DEFERRABLE INITIALLY DEFERRED,
        number integer NOT NULL,
        line integer NOT NULL,
        field text NOT NULL,
        found text NOT NULL,
        reason text NOT NULL,
        PRIMARY KEY (observation_set_id, number)
      );

      CREATE TABLE jobs (
        id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
        team_id uuid NOT NULL REFERENCES teams ON DELETE CASCADE,
        user_id uuid REFERENCES users ON DELETE SET NULL,
        kind text NOT NULL,
        state text NOT NULL DEFAULT 'queued'
          CHECK (state IN ('queued', 'running', 'paused', 'complete', 'failed', 'cancelled')),
        payload jsonb NOT NULL,
        fraction double precision NOT NULL DEFAULT 0,
        phase text NOT NULL DEFAULT '',
        result jsonb,
        error jsonb,
        cancel_requested boolean NOT NULL DEFAULT false,
        attempt integer NOT NULL DEFAULT 0,
        created_at timestamptz(3) NOT NULL DEFAULT now(),
        started_at timestamptz,
        finished_at timestamptz,
        heartbeat_at timestamptz
      );
      CREATE INDEX jobs_team ON jobs (team_id, created_at DESC, id);
      CREATE INDEX jobs_user ON jobs (user_id);

      CREATE TABLE designs (
        id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
        team_id uuid NOT NULL REFERENCES teams ON DELETE CASCADE,
        study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
        observation_set_id uuid NOT NULL REFERENCES observation_sets,
        name text NOT NULL,
        recipe jsonb NOT NULL,
        correlation jsonb,
        revision integer NOT NULL DEFAULT 1,
        check_job_id uuid REFERENCES jobs ON DELETE SET NULL,
        check_revision integer,
        updated_by uuid REFERENCES users ON DELETE SET NULL,
        created_at timestamptz(3) NOT NULL DEFAULT now(),
        updated_at timestamptz NOT NULL DEFAULT now()
      );
      CREATE INDEX designs_study ON designs (study_id, created_at DESC, id);
      CREATE INDEX designs_team ON designs (team_id);
      CREATE INDEX designs_observation_set ON designs (observation_set_id);
      CREATE INDEX designs_check_job ON designs (check_job_id);
      CREATE INDEX designs_updater ON designs (updated_by);

      CREATE FUNCTION refuse_change() RETURNS trigger LANGUAGE plpgsql AS $$
      BEGIN
        RAISE EXCEPTION 'Rows of % never change once written.', TG_TABLE_NAME USING ERRCODE = 'restrict_violation';
      END $$;
      CREATE TRIGGER stored_files_immutable BEFORE UPDATE ON stored_files FOR EACH ROW EXECUTE FUNCTION refuse_change();
      CREATE TRIGGER stored_file_chunks_immutable BEFORE UPDATE ON stored_file_chunks FOR EACH ROW EXECUTE FUNCTION refuse_change();
      CREATE TRIGGER rejected_rows_immutable BEFORE UPDATE ON rejected_rows FOR EACH ROW EXECUTE FUNCTION refuse_change();
      CREATE TRIGGER observation_sets_immutable
        BEFORE UPDATE OF team_id, study_id, file_id, format, crs, mapping, rows_read, accepted, rejected_count, facts, columns_bundle
        ON observation_sets FOR EACH ROW EXECUTE FUNCTION refuse_change();

      GRANT SELECT, INSERT, UPDATE, DELETE ON studies, designs, jobs TO ${RUNTIME_ROLE};
      GRANT SELECT, INSERT, DELETE ON stored_files, stored_file_chunks, rejected_rows, observation_sets TO ${RUNTIME_ROLE};
      GRANT UPDATE (name, created_by) ON observation_sets TO ${RUNTIME_ROLE};
    `);
  },
  async down({ sql }) {
    await sql('DROP TABLE designs, jobs, rejected_rows, observation_sets, stored_file_chunks, stored_files, studies; DROP FUNCTION refuse_change()');
  },
};
