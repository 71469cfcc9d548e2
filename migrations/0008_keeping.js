/**
 * What a move must keep clear of and leave alone: keep-outs and locks, with their history as design boxes have theirs; the
 * study's symmetry plane; rehearsal objectives.
 */
export async function up({ context: { sequelize } }) {
	await sequelize.query(`
		ALTER TABLE design_box_versions RENAME COLUMN box_id TO owner_id;
		CREATE TABLE keep_outs (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
			-- An uploaded surface: float32 x, y, z in the study's length unit, and uint32 corners; it never changes.
			positions_id uuid REFERENCES contents,
			triangles_id uuid REFERENCES contents,
			original_id uuid REFERENCES contents,
			archived_at timestamptz,
			created_at timestamptz NOT NULL DEFAULT now(),
			CHECK ((positions_id IS NULL) = (triangles_id IS NULL))
		);
		CREATE INDEX keep_outs_study ON keep_outs (study_id, created_at);
		CREATE TABLE keep_out_versions (
			owner_id uuid NOT NULL REFERENCES keep_outs ON DELETE CASCADE,
			version integer NOT NULL CHECK (version >= 1),
			definition jsonb NOT NULL,
			created_by uuid REFERENCES users,
			created_at timestamptz NOT NULL DEFAULT now(),
			PRIMARY KEY (owner_id, version)
		);
		CREATE TRIGGER keep_out_versions_are_kept BEFORE UPDATE ON keep_out_versions FOR EACH ROW EXECUTE FUNCTION refuse_change();
		CREATE TABLE locks (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
			archived_at timestamptz,
			created_at timestamptz NOT NULL DEFAULT now()
		);
		CREATE INDEX locks_study ON locks (study_id, created_at);
		CREATE TABLE lock_versions (
			owner_id uuid NOT NULL REFERENCES locks ON DELETE CASCADE,
			version integer NOT NULL CHECK (version >= 1),
			definition jsonb NOT NULL,
			created_by uuid REFERENCES users,
			created_at timestamptz NOT NULL DEFAULT now(),
			PRIMARY KEY (owner_id, version)
		);
		CREATE TRIGGER lock_versions_are_kept BEFORE UPDATE ON lock_versions FOR EACH ROW EXECUTE FUNCTION refuse_change();
		-- {point, normal} in metres, or null.
		ALTER TABLE studies ADD COLUMN symmetry jsonb;
		-- What a rehearsal objective computes; null: the solver returns it.
		ALTER TABLE objectives ADD COLUMN rehearsal jsonb;
		ALTER TABLE maps ADD COLUMN rehearsal boolean NOT NULL DEFAULT false;
		ALTER TABLE results ADD COLUMN rehearsal boolean NOT NULL DEFAULT false;
		ALTER TABLE maps ALTER COLUMN original_id DROP NOT NULL;
		ALTER TABLE jobs DROP CONSTRAINT jobs_kind_check;
		ALTER TABLE jobs ADD CONSTRAINT jobs_kind_check
			CHECK (kind IN ('import-shape', 'import-map', 'import-keep-out', 'rehearse', 'repair', 'move'));
	`);
}

export async function down({ context: { sequelize } }) {
	await sequelize.query(`
		ALTER TABLE jobs DROP CONSTRAINT jobs_kind_check;
		ALTER TABLE jobs ADD CONSTRAINT jobs_kind_check CHECK (kind IN ('import-shape', 'import-map', 'move'));
		ALTER TABLE maps ALTER COLUMN original_id SET NOT NULL;
		ALTER TABLE results DROP COLUMN rehearsal;
		ALTER TABLE maps DROP COLUMN rehearsal;
		ALTER TABLE objectives DROP COLUMN rehearsal;
		ALTER TABLE studies DROP COLUMN symmetry;
		DROP TABLE lock_versions, locks, keep_out_versions, keep_outs;
		ALTER TABLE design_box_versions RENAME COLUMN owner_id TO box_id;
	`);
}
