/** Topologies, shapes, maps, moves and results. A row here is written once, whole, and never changed. */
export async function up({ context: { sequelize } }) {
	await sequelize.query(`
		CREATE TABLE topologies (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
			vertex_count integer NOT NULL CHECK (vertex_count > 0),
			triangle_count integer NOT NULL CHECK (triangle_count > 0),
			triangles_id uuid NOT NULL REFERENCES contents,
			-- Attribute words of a binary STL, uint16 a triangle, where any is not zero.
			attributes_id uuid REFERENCES contents,
			patches jsonb NOT NULL,
			encoding text NOT NULL CHECK (encoding IN ('binary', 'ascii')),
			health jsonb NOT NULL,
			created_at timestamptz NOT NULL DEFAULT now()
		);
		CREATE TABLE shapes (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
			number integer NOT NULL CHECK (number >= 0),
			parent_id uuid REFERENCES shapes,
			name text NOT NULL,
			note text NOT NULL DEFAULT '',
			topology_id uuid NOT NULL REFERENCES topologies,
			-- float32 x, y, z little-endian in the study's length unit.
			positions_id uuid NOT NULL REFERENCES contents,
			original_id uuid REFERENCES contents,
			filename text,
			measures jsonb NOT NULL,
			created_by uuid REFERENCES users,
			created_at timestamptz NOT NULL DEFAULT now(),
			UNIQUE (study_id, number)
		);
		CREATE INDEX shapes_parent ON shapes (parent_id);
		CREATE TABLE maps (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			shape_id uuid NOT NULL REFERENCES shapes ON DELETE CASCADE,
			objective_id uuid NOT NULL REFERENCES objectives,
			operating_point_id uuid NOT NULL REFERENCES operating_points,
			filename text NOT NULL,
			kind text NOT NULL CHECK (kind IN ('density', 'nodal', 'vector')),
			location text NOT NULL CHECK (location IN ('vertex', 'face')),
			outward text NOT NULL CHECK (outward IN ('raises', 'lowers')),
			original_id uuid NOT NULL REFERENCES contents,
			-- float64 little-endian, one (or three, for vectors) a vertex or a face, as the file gave them.
			values_id uuid NOT NULL REFERENCES contents,
			report jsonb NOT NULL,
			created_by uuid REFERENCES users,
			created_at timestamptz NOT NULL DEFAULT now()
		);
		CREATE INDEX maps_shape ON maps (shape_id, objective_id, operating_point_id, created_at);
		CREATE TABLE moves (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
			parent_shape_id uuid NOT NULL REFERENCES shapes,
			shape_id uuid NOT NULL UNIQUE REFERENCES shapes,
			recipe jsonb NOT NULL,
			answer jsonb NOT NULL,
			-- float64 displacements of the control points, box after box, m.
			lattices_id uuid NOT NULL REFERENCES contents,
			created_by uuid REFERENCES users,
			created_at timestamptz NOT NULL DEFAULT now()
		);
		CREATE TABLE results (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			shape_id uuid NOT NULL REFERENCES shapes ON DELETE CASCADE,
			objective_id uuid NOT NULL REFERENCES objectives,
			operating_point_id uuid NOT NULL REFERENCES operating_points,
			value double precision NOT NULL,
			uncertainty double precision CHECK (uncertainty >= 0),
			note text NOT NULL DEFAULT '',
			created_by uuid REFERENCES users,
			created_at timestamptz NOT NULL DEFAULT now()
		);
		CREATE INDEX results_shape ON results (shape_id, objective_id, operating_point_id, created_at);

		CREATE TRIGGER topologies_are_kept BEFORE UPDATE ON topologies FOR EACH ROW EXECUTE FUNCTION refuse_change();
		CREATE TRIGGER shapes_are_kept BEFORE UPDATE ON shapes FOR EACH ROW EXECUTE FUNCTION refuse_change();
		CREATE TRIGGER maps_are_kept BEFORE UPDATE ON maps FOR EACH ROW EXECUTE FUNCTION refuse_change();
		CREATE TRIGGER moves_are_kept BEFORE UPDATE ON moves FOR EACH ROW EXECUTE FUNCTION refuse_change();
		CREATE TRIGGER results_are_kept BEFORE UPDATE ON results FOR EACH ROW EXECUTE FUNCTION refuse_change();
	`);
}

export async function down({ context: { sequelize } }) {
	await sequelize.query('DROP TABLE results, moves, maps, shapes, topologies');
}
