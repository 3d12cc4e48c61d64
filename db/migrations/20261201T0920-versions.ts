import { RUNTIME_ROLE } from '../connect.ts';
import type { Migration } from '../migrate.ts';

/** Mesh versions and their exports: written once, never changed or deleted; a version's state is a row of its own. */
export const versions: Migration = {
  name: '20261201T0920-versions',
  async up({ sql }) {
    await sql(`
      CREATE TABLE mesh_versions (
        id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
        team_id uuid NOT NULL REFERENCES teams,
        study_id uuid NOT NULL REFERENCES studies,
        design_id uuid,
        design_name text NOT NULL,
        observation_set_id uuid NOT NULL REFERENCES observation_sets,
        observation_sha256 text NOT NULL,
        number integer NOT NULL,
        recipe jsonb NOT NULL,
        correlation jsonb NOT NULL,
        findings jsonb NOT NULL,
        figures jsonb NOT NULL,
        verdict text NOT NULL CHECK (verdict IN ('pass', 'warn', 'fail')),
        waiver text,
        note text NOT NULL DEFAULT '',
        nodes integer NOT NULL,
        elements integer NOT NULL,
        mesh_hash text NOT NULL CHECK (mesh_hash ~ '^[0-9a-f]{64}$'),
        arrays bytea NOT NULL,
        software_version text NOT NULL,
        job_id uuid UNIQUE,
        saved_by uuid REFERENCES users,
        saved_by_name text NOT NULL,
        saved_at timestamptz(3) NOT NULL DEFAULT now(),
        UNIQUE (study_id, number),
        CHECK (verdict <> 'fail' OR waiver IS NOT NULL)
      );
      CREATE INDEX mesh_versions_team ON mesh_versions (team_id);
      CREATE INDEX mesh_versions_observation_set ON mesh_versions (observation_set_id);
      CREATE INDEX mesh_versions_saver ON mesh_versions (saved_by);
      ALTER TABLE mesh_versions ALTER COLUMN arrays SET STORAGE EXTERNAL;

      CREATE TABLE mesh_version_states (
        version_id uuid PRIMARY KEY REFERENCES mesh_versions,
        team_id uuid NOT NULL REFERENCES teams,
        state text NOT NULL DEFAULT 'saved'
          CHECK (state IN ('saved', 'in-review', 'approved', 'returned', 'superseded', 'withdrawn')),
        updated_at timestamptz NOT NULL DEFAULT now()
      );
      CREATE INDEX mesh_version_states_team ON mesh_version_states (team_id);

      CREATE TABLE export_files (
        version_id uuid NOT NULL REFERENCES mesh_versions,
        format text NOT NULL,
        team_id uuid NOT NULL REFERENCES teams,
        file_name text NOT NULL,
        media_type text NOT NULL,
        sha256 text NOT NULL CHECK (sha256 ~ '^[0-9a-f]{64}$'),
        bytes bytea NOT NULL,
        created_at timestamptz(3) NOT NULL DEFAULT now(),
        PRIMARY KEY (version_id, format)
      );
      CREATE INDEX export_files_team ON export_files (team_id);
      ALTER TABLE export_files ALTER COLUMN bytes SET STORAGE EXTERNAL;

      CREATE TRIGGER mesh_versions_immutable BEFORE UPDATE OR DELETE ON mesh_versions FOR EACH ROW EXECUTE FUNCTION refuse_change();
      CREATE TRIGGER export_files_immutable BEFORE UPDATE OR DELETE ON export_files FOR EACH ROW EXECUTE FUNCTION refuse_change();
      CREATE TRIGGER mesh_versions_kept BEFORE TRUNCATE ON mesh_versions EXECUTE FUNCTION refuse_change();
      CREATE TRIGGER export_files_kept BEFORE TRUNCATE ON export_files EXECUTE FUNCTION refuse_change();

      GRANT SELECT, INSERT ON mesh_versions, export_files TO ${RUNTIME_ROLE};
      GRANT SELECT, INSERT, UPDATE ON mesh_version_states TO ${RUNTIME_ROLE};
    `);
  },
  async down({ sql }) {
    await sql('DROP TABLE export_files, mesh_version_states, mesh_versions');
  },
};
