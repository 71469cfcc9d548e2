/**
 * Everything large is a content: an ordered list of chunks, each stored once under its SHA-256. Chunks are never changed;
 * one that nothing names any more may be removed.
 */
export async function up({ context: { sequelize } }) {
	await sequelize.query(`
		CREATE FUNCTION refuse_change() RETURNS trigger LANGUAGE plpgsql AS $$
		BEGIN
			RAISE EXCEPTION '% rows are never changed; corrections are new rows', TG_TABLE_NAME USING ERRCODE = 'restrict_violation';
		END $$;

		CREATE TABLE blobs (
			sha256 bytea PRIMARY KEY CHECK (length(sha256) = 32),
			size integer NOT NULL CHECK (size > 0),
			bytes bytea NOT NULL CHECK (length(bytes) = size)
		);
		-- Numbers hardly compress: uncompressed out-of-line storage reads several times faster.
		ALTER TABLE blobs ALTER COLUMN bytes SET STORAGE EXTERNAL;

		CREATE TABLE contents (
			id uuid PRIMARY KEY DEFAULT gen_random_uuid(),
			sha256 bytea NOT NULL CHECK (length(sha256) = 32),
			size bigint NOT NULL CHECK (size >= 0),
			chunk_bytes integer NOT NULL CHECK (chunk_bytes > 0),
			created_at timestamptz NOT NULL DEFAULT now()
		);
		CREATE TABLE content_chunks (
			content_id uuid NOT NULL REFERENCES contents ON DELETE CASCADE,
			ordinal integer NOT NULL CHECK (ordinal >= 0),
			sha256 bytea NOT NULL REFERENCES blobs,
			PRIMARY KEY (content_id, ordinal)
		);
		CREATE INDEX content_chunks_sha256 ON content_chunks (sha256);

		CREATE TRIGGER contents_are_kept BEFORE UPDATE ON contents FOR EACH ROW EXECUTE FUNCTION refuse_change();
		CREATE TRIGGER content_chunks_are_kept BEFORE UPDATE ON content_chunks FOR EACH ROW EXECUTE FUNCTION refuse_change();
	`);
}

export async function down({ context: { sequelize } }) {
	await sequelize.query('DROP TABLE content_chunks, contents, blobs; DROP FUNCTION refuse_change()');
}
