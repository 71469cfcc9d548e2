/** API tokens (only their hash is kept) and the append-only record of who did what. */
export async function up({ context: { sequelize } }) {
	await sequelize.query(`
		CREATE TABLE api_tokens (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			user_id uuid NOT NULL REFERENCES users ON DELETE CASCADE,
			study_id uuid REFERENCES studies ON DELETE CASCADE,
			name text NOT NULL,
			prefix text NOT NULL,
			hash bytea NOT NULL UNIQUE CHECK (length(hash) = 32),
			created_at timestamptz NOT NULL DEFAULT now(),
			last_used_at timestamptz,
			revoked_at timestamptz
		);
		CREATE INDEX api_tokens_user ON api_tokens (user_id);
		CREATE TABLE audit_events (
			id bigint GENERATED ALWAYS AS IDENTITY PRIMARY KEY,
			at timestamptz NOT NULL DEFAULT now(),
			user_id uuid REFERENCES users,
			token_id uuid REFERENCES api_tokens,
			study_id uuid REFERENCES studies ON DELETE CASCADE,
			action text NOT NULL,
			subject_id uuid,
			detail jsonb NOT NULL DEFAULT '{}'
		);
		CREATE INDEX audit_events_study ON audit_events (study_id, at);
		CREATE TRIGGER audit_events_are_kept BEFORE UPDATE ON audit_events FOR EACH ROW EXECUTE FUNCTION refuse_change();
	`);
}

export async function down({ context: { sequelize } }) {
	await sequelize.query('DROP TABLE audit_events, api_tokens');
}
