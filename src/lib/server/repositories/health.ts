import { QueryTypes } from 'sequelize';
import { database } from '../db/client';

/** Names of the migrations that the database has had; throws when it does not answer or has had none. */
export async function listMigrations(): Promise<string[]> {
	const rows = await database().query<{ name: string }>('SELECT name FROM migrations ORDER BY name', {
		type: QueryTypes.SELECT
	});
	return rows.map(({ name }) => name);
}
