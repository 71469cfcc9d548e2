/** Brings a database to the newest schema with umzug; one advisory lock, so that two processes may start at once. */
import { pathToFileURL } from 'node:url';
import type { QueryInterface, Sequelize } from 'sequelize';
import { SequelizeStorage, Umzug } from 'umzug';

const MIGRATION_LOCK = 7_264_501;

/**
 * @param folder absolute path of the project's `migrations`
 * @returns the names of the migrations that were applied
 */
export async function migrate(sequelize: Sequelize, folder: string): Promise<string[]> {
	const umzug = new Umzug<QueryInterface>({
		migrations: {
			glob: ['*.js', { cwd: folder }],
			resolve: ({ name, path, context }) => {
				const load = () => import(/* @vite-ignore */ pathToFileURL(path!).href);
				return {
					name,
					up: async () => (await load()).up({ context }),
					down: async () => (await load()).down({ context })
				};
			}
		},
		context: sequelize.getQueryInterface(),
		storage: new SequelizeStorage({ sequelize, tableName: 'migrations' }),
		logger: undefined
	});
	return sequelize.transaction(async (transaction) => {
		// Held until this transaction ends, while the migrations run on connections of their own.
		await sequelize.query('SELECT pg_advisory_xact_lock($1)', { bind: [MIGRATION_LOCK], transaction });
		return (await umzug.up()).map((m) => m.name);
	});
}
