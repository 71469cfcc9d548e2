/** Design boxes with their history: an edit is a new version, a recipe keeps the one it used. */
export async function up({ context: { sequelize } }) {
	await sequelize.query(`
		CREATE TABLE design_boxes (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
			archived_at timestamptz,
			created_at timestamptz NOT NULL DEFAULT now()
		);
		CREATE INDEX design_boxes_study ON design_boxes (study_id, created_at);
		CREATE TABLE design_box_versions (
			box_id uuid NOT NULL REFERENCES design_boxes ON DELETE CASCADE,
			version integer NOT NULL CHECK (version >= 1),
			definition jsonb NOT NULL,
			created_by uuid REFERENCES users,
			created_at timestamptz NOT NULL DEFAULT now(),
			PRIMARY KEY (box_id, version)
		);
		CREATE TRIGGER design_box_versions_are_kept BEFORE UPDATE ON design_box_versions FOR EACH ROW EXECUTE FUNCTION refuse_change();
	`);
}

export async function down({ context: { sequelize } }) {
	await sequelize.query('DROP TABLE design_box_versions, design_boxes');
}
