/** Makes an API token: --email E [--study ID] [--name N]. The token is the last line printed; all else goes to stderr. */
import { parseArgs } from 'node:util';
import { closeDatabase } from '$lib/server/db/client';
import { createTokenFor } from '$lib/server/services/tokens';
import { explain, Misuse } from './shared/explain';

const USAGE = 'npm run token -- --email E [--study ID] [--name N]';

try {
	const { values } = parseArgs({
		options: { email: { type: 'string' }, study: { type: 'string' }, name: { type: 'string' } }
	});
	if (!values.email) throw new Misuse('Whose token? Give --email.');
	const name = values.name?.trim() || 'Command line';
	const { token, prefix, owner, studyId } = await createTokenFor(values.email, name, values.study ?? null);
	console.error(
		`Token ${prefix}… of ${owner.name} for ${studyId ? `study ${studyId}` : 'all their studies'}; shown once:`
	);
	console.log(token);
} catch (thrown) {
	process.exitCode = explain(thrown, USAGE);
} finally {
	await closeDatabase();
}
