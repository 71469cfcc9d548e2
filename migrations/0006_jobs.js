/** Jobs as the pages and programs see them; pg-boss keeps the queue itself in its own schema. */
export async function up({ context: { sequelize } }) {
	await sequelize.query(`
		CREATE TABLE jobs (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			kind text NOT NULL CHECK (kind IN ('import-shape', 'import-map', 'move')),
			study_id uuid NOT NULL REFERENCES studies ON DELETE CASCADE,
			payload jsonb NOT NULL,
			state text NOT NULL DEFAULT 'queued' CHECK (state IN ('queued', 'running', 'done', 'failed', 'cancelled')),
			progress double precision NOT NULL DEFAULT 0 CHECK (progress BETWEEN 0 AND 1),
			message text NOT NULL DEFAULT '',
			result jsonb,
			error jsonb,
			cancel_requested boolean NOT NULL DEFAULT false,
			attempts integer NOT NULL DEFAULT 0,
			worker text,
			-- Set again every few seconds by the worker; a running job whose heart has stopped is given to another.
			heartbeat_at timestamptz,
			created_by uuid REFERENCES users,
			created_at timestamptz NOT NULL DEFAULT now(),
			finished_at timestamptz
		);
		CREATE INDEX jobs_running ON jobs (heartbeat_at) WHERE state = 'running';
		CREATE INDEX jobs_study ON jobs (study_id, created_at);

		CREATE FUNCTION tell_job() RETURNS trigger LANGUAGE plpgsql AS $$
		BEGIN
			PERFORM pg_notify('planish_jobs', NEW.id::text);
			RETURN NULL;
		END $$;
		CREATE TRIGGER jobs_are_told AFTER UPDATE OF state, progress, message, cancel_requested ON jobs
			FOR EACH ROW EXECUTE FUNCTION tell_job();
	`);
}

export async function down({ context: { sequelize } }) {
	await sequelize.query('DROP TABLE jobs; DROP FUNCTION tell_job()');
}
