/** Studies, their people, objectives and operating points. */
export async function up({ context: { sequelize } }) {
	await sequelize.query(`
		CREATE TABLE studies (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			name text NOT NULL,
			note text NOT NULL DEFAULT '',
			length_unit text NOT NULL CHECK (length_unit IN ('m', 'mm', 'cm', 'in')),
			reference_area double precision,
			density double precision,
			speed double precision,
			invented boolean NOT NULL DEFAULT false,
			-- The number the next shape gets; taken under a row lock, so numbers have no gaps and no doubles.
			next_shape_number integer NOT NULL DEFAULT 0,
			created_by uuid REFERENCES users,
			created_at timestamptz NOT NULL DEFAULT now(),
			updated_at timestamptz NOT NULL DEFAULT now()
		);
		CREATE TABLE study_members (
			study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
			user_id uuid NOT NULL REFERENCES users ON DELETE CASCADE,
			role text NOT NULL CHECK (role IN ('viewer', 'reviewer', 'engineer')),
			created_at timestamptz NOT NULL DEFAULT now(),
			PRIMARY KEY (study_id, user_id)
		);
		CREATE INDEX study_members_user ON study_members (user_id);
		CREATE TABLE objectives (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
			position integer NOT NULL,
			name text NOT NULL,
			unit text NOT NULL,
			sense text NOT NULL CHECK (sense IN ('minimise', 'maximise', 'hold')),
			weight double precision NOT NULL CHECK (weight >= 0),
			created_at timestamptz NOT NULL DEFAULT now(),
			updated_at timestamptz NOT NULL DEFAULT now(),
			UNIQUE (study_id, position),
			UNIQUE (study_id, name)
		);
		CREATE TABLE operating_points (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
			position integer NOT NULL,
			name text NOT NULL,
			speed double precision,
			density double precision,
			yaw double precision,
			weight double precision NOT NULL CHECK (weight >= 0),
			created_at timestamptz NOT NULL DEFAULT now(),
			UNIQUE (study_id, position),
			UNIQUE (study_id, name)
		);
	`);
}

export async function down({ context: { sequelize } }) {
	await sequelize.query('DROP TABLE operating_points, objectives, study_members, studies');
}
