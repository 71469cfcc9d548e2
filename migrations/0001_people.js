/** People, and the tables that Auth.js's adapters expect (column names are theirs). */
export async function up({ context: { sequelize } }) {
	await sequelize.query(`
		CREATE TABLE users (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			email text NOT NULL CHECK (email = lower(email)),
			name text NOT NULL,
			email_verified timestamptz,
			image text,
			password_hash text,
			is_admin boolean NOT NULL DEFAULT false,
			active boolean NOT NULL DEFAULT true,
			-- Raised to end every session of a person at once (new password, deactivation).
			session_epoch integer NOT NULL DEFAULT 0,
			created_at timestamptz NOT NULL DEFAULT now(),
			updated_at timestamptz NOT NULL DEFAULT now(),
			UNIQUE (email)
		);
		CREATE TABLE accounts (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			user_id uuid NOT NULL REFERENCES users ON DELETE CASCADE,
			type text NOT NULL,
			provider text NOT NULL,
			provider_account_id text NOT NULL,
			refresh_token text,
			access_token text,
			expires_at integer,
			token_type text,
			scope text,
			id_token text,
			session_state text,
			UNIQUE (provider, provider_account_id)
		);
		CREATE TABLE sessions (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			user_id uuid NOT NULL REFERENCES users ON DELETE CASCADE,
			session_token text NOT NULL UNIQUE,
			expires timestamptz NOT NULL
		);
		CREATE TABLE verification_tokens (
			token text PRIMARY KEY,
			identifier text NOT NULL,
			expires timestamptz NOT NULL
		);
	`);
}

export async function down({ context: { sequelize } }) {
	await sequelize.query('DROP TABLE verification_tokens, sessions, accounts, users');
}
