/**
 * Makes a person or changes one, where nobody can yet sign in to do it: the first admin, a lost password, a study whose
 * engineers are gone. A password that is not given is made up and printed as the last line; all else goes to stderr.
 */
import { randomBytes } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { parseArgs } from 'node:util';
import { role as studyRole } from '$lib/api/schemas/common';
import { userCreate } from '$lib/api/schemas/people';
import { closeDatabase } from '$lib/server/db/client';
import { AppError } from '$lib/server/errors';
import { placeMember } from '$lib/server/services/members';
import { putPerson } from '$lib/server/services/users';
import { explain, Misuse } from './shared/explain';

const USAGE = `npm run person -- --email E [--name N] [--admin] [--new-password | --password-file FILE] [--study ID --role ROLE]
  --password-file -   reads the password from standard input`;

/** @returns null when the person's password is to stay */
function choosePassword(file: string | undefined, fresh: boolean): string | null {
	if (file !== undefined) return readFileSync(file === '-' ? 0 : file, 'utf8').replace(/\r?\n$/, '');
	return fresh ? randomBytes(15).toString('base64url') : null;
}

try {
	const { values } = parseArgs({
		options: {
			email: { type: 'string' },
			name: { type: 'string' },
			admin: { type: 'boolean', default: false },
			'new-password': { type: 'boolean', default: false },
			'password-file': { type: 'string' },
			study: { type: 'string' },
			role: { type: 'string' }
		}
	});
	if (!values.email) throw new Misuse('Who? Give --email.');
	if ((values.study === undefined) !== (values.role === undefined)) throw new Misuse('--study and --role go together.');
	const role = values.role === undefined ? null : studyRole.safeParse(values.role);
	if (role?.success === false) throw new Misuse(`--role is one of ${studyRole.options.join(', ')}.`);

	const given = choosePassword(values['password-file'], values['new-password']);
	const invented = randomBytes(15).toString('base64url');
	const checked = userCreate.safeParse({
		email: values.email,
		name: values.name ?? values.email,
		password: given ?? invented
	});
	if (!checked.success)
		throw new AppError('invalid', checked.error.issues.map((i) => `${i.path}: ${i.message}`).join('; '));
	const { created, user } = await putPerson({
		email: checked.data.email,
		name: values.name === undefined ? undefined : checked.data.name,
		isAdmin: values.admin || undefined,
		password: given ?? undefined,
		firstPassword: invented
	});
	console.error(
		`${user.name} <${user.email}> ${created ? 'is here now' : 'was here'}${user.isAdmin ? ', as admin' : ''}.`
	);
	if (values.study && role) {
		await placeMember(values.study, user.id, role.data);
		console.error(`In study ${values.study} as ${role.data}.`);
	}
	const printed = values['password-file'] === undefined && (created || given !== null) ? (given ?? invented) : null;
	if (printed !== null) {
		console.error('The password, shown once:');
		console.log(printed);
	}
} catch (thrown) {
	process.exitCode = explain(thrown, USAGE);
} finally {
	await closeDatabase();
}
