// One private PostgreSQL cluster: made, started, adopted and stopped. It listens on loopback only, has no unix socket
// (so nothing of it lies in a temp folder), and asks for a password (SCRAM) like any other server.
import {
	chmodSync,
	chownSync,
	existsSync,
	mkdirSync,
	readFileSync,
	readdirSync,
	renameSync,
	rmSync,
	statSync,
	writeFileSync
} from 'node:fs';
import { execFileSync } from 'node:child_process';
import { randomBytes } from 'node:crypto';
import { dirname, join } from 'node:path';
import { setTimeout as sleep } from 'node:timers/promises';
import { installPostgres } from './install.mjs';
import { freePort, whyNot } from './ports.mjs';
import { commandLine, endProcess, identify, isAlive, must, processesIn, run } from './processes.mjs';
import { Trouble, lastLines, note } from './say.mjs';
import { dataFolder } from './settings.mjs';

/**
 * @typedef {object} Cluster
 * @property {string} folder PostgreSQL's data directory (PGDATA)
 * @property {string} log
 * @property {string} bin the folder of initdb, pg_ctl and so on
 * @property {{ name: string, uid: number, gid: number } | null} owner the user to run as when this is root
 * @property {number} port
 * @property {string} password of the database user "planish"
 * @property {string} record the file that remembers port and folder
 */

const INSTALLED = '/usr/lib/postgresql';

/** Against a stop in mid-write everything is synced; a test's cluster is thrown away and need not be. */
const DURABLE = ['shared_buffers=128MB', 'max_connections=100', 'max_wal_size=2GB', 'wal_compression=on'];
const THROWAWAY = [...DURABLE, 'fsync=off', 'synchronous_commit=off', 'full_page_writes=off', 'autovacuum=off'];

/**
 * @param {string} [version] the major version that a cluster was made with
 * @returns {string | null} the newest version's programs, or those of the version asked for
 */
export function findBinaries(version) {
	if (!existsSync(INSTALLED)) return null;
	const found = readdirSync(INSTALLED)
		.filter((name) => existsSync(join(INSTALLED, name, 'bin', 'initdb')))
		.filter((name) => !version || name === version)
		.sort((a, b) => Number(b) - Number(a));
	return found.length > 0 ? join(INSTALLED, found[0], 'bin') : null;
}

/**
 * Finds PostgreSQL's programs for a cluster's folder, and installs them when there are none.
 * @param {string} folder
 */
async function ensureBinaries(folder) {
	const file = join(folder, 'PG_VERSION');
	const version = existsSync(file) ? readFileSync(file, 'utf8').trim() : undefined;
	const found = findBinaries(version);
	if (found) return found;
	if (version && findBinaries()) {
		throw new Trouble(
			`The database in ${folder} was made by PostgreSQL ${version}, which is not installed here any more. ` +
				`Install postgresql-${version}, or move the database as docs/operations.md says.`
		);
	}
	await installPostgres();
	const installed = findBinaries(version);
	if (!installed) throw new Trouble(`PostgreSQL was installed, but ${INSTALLED}/*/bin/initdb is not there.`);
	return installed;
}

/**
 * Says early, before the packages and the build take their minutes, that PostgreSQL is missing and cannot be installed.
 * @param {string} data
 */
export async function ensurePostgres(data) {
	await ensureBinaries(join(readRecord(data).home ?? join(data, 'postgres'), 'cluster'));
}

/**
 * @param {string} data
 * @returns {{ port?: number, home?: string }} what is remembered of the data folder's cluster
 */
export function readRecord(data) {
	const record = join(data, 'postgres.json');
	return existsSync(record) ? JSON.parse(readFileSync(record, 'utf8')) : {};
}

/** PostgreSQL's own commands are short, and stopped halfway they would leave a server that nobody knows of. */
const HERE = { cwd: '/', finish: true };

/** @param {string} name */
function userNamed(name) {
	/** @param {string} option */
	const id = (option) => Number(execFileSync('id', [option, name], { encoding: 'utf8', stdio: 'pipe' }));
	return { name, uid: id('-u'), gid: id('-g') };
}

/**
 * @param {string} program
 * @param {string[]} args
 * @param {Cluster['owner']} owner
 * @returns {[string, string[]]}
 */
function asOwner(program, args, owner) {
	return owner ? ['runuser', ['-u', owner.name, '--', program, ...args]] : [program, args];
}

/**
 * Finds the place for the cluster of a data folder. PostgreSQL refuses to run as root, so root runs it as the user
 * "postgres"; where that user cannot enter the data folder's parents, the cluster lives under /var/lib/planish.
 * @param {string} data
 * @returns {Promise<Cluster>}
 */
export async function findCluster(data) {
	const root = process.getuid?.() === 0;
	dataFolder(data);
	const record = join(data, 'postgres.json');
	const known = readRecord(data);
	let home = known.home ?? join(data, 'postgres');
	const bin = await ensureBinaries(join(home, 'cluster'));
	let owner = null;
	if (root) {
		owner = userNamed('postgres');
		const user = existsSync(home) ? execFileSync('stat', ['-c', '%U', home], { encoding: 'utf8' }).trim() : owner.name;
		// Root would leave files in that user's data folder which the user cannot read.
		if (![owner.name, 'root'].includes(user)) {
			throw new Trouble(
				`The database in ${home} belongs to the user ${user}. Start as that user: runuser -u ${user} -- npm start`
			);
		}
		// The data folder is ours to open; its parents are not.
		if ((statSync(data).mode & 0o001) === 0) chmodSync(data, (statSync(data).mode & 0o777) | 0o001);
		const entered = await run(...asOwner('test', ['-x', dirname(home)], owner), HERE);
		if (entered.code !== 0) {
			if (known.home) throw new Trouble(`The user ${owner.name} cannot enter ${dirname(home)}, where the database is.`);
			// Not named after the data folder: a new one of the same name must not meet the old one's database.
			const name = randomBytes(6).toString('hex');
			note(
				`The user ${owner.name}, who runs PostgreSQL, cannot enter ${data}: its database goes to /var/lib/planish/${name}.`
			);
			mkdirSync(`/var/lib/planish/${name}`, { recursive: true, mode: 0o711 });
			home = `/var/lib/planish/${name}/postgres`;
		}
	} else if (existsSync(home) && statSync(home).uid !== process.getuid?.()) {
		throw new Trouble(
			`The database in ${home} belongs to another user. Start as that user (or as root), or set PLANISH_DATA to a folder of yours.`
		);
	}
	if (!existsSync(home)) mkdirSync(home, { mode: 0o700 });
	if (owner) chownSync(home, owner.uid, owner.gid);
	const secret = join(data, 'postgres-password');
	if (!existsSync(secret)) writeFileSync(secret, randomBytes(24).toString('hex'), { mode: 0o600, flag: 'wx' });
	const cluster = {
		folder: join(home, 'cluster'),
		log: join(home, 'postgres.log'),
		bin,
		owner,
		port: known.port ?? (await freePort()),
		password: readFileSync(secret, 'utf8').trim(),
		record
	};
	remember(cluster);
	return cluster;
}

/** @param {Cluster} cluster */
function remember({ record, port, folder }) {
	writeFileSync(`${record}.new`, JSON.stringify({ port, home: dirname(folder) }), { mode: 0o600 });
	renameSync(`${record}.new`, record);
}

/**
 * Makes the cluster if there is none. It gets its name last: one that was interrupted is made anew.
 * @param {Cluster} cluster
 * @param {boolean} throwaway
 */
async function makeCluster({ folder, bin, owner, password }, throwaway) {
	if (existsSync(folder)) return;
	const unfinished = `${folder}.new`;
	rmSync(unfinished, { recursive: true, force: true });
	const passwordFile = join(dirname(folder), 'initdb-password');
	writeFileSync(passwordFile, `${password}\n`, { mode: 0o600 });
	if (owner) chownSync(passwordFile, owner.uid, owner.gid);
	try {
		const args = ['-D', unfinished, '-U', 'planish', '-A', 'scram-sha-256', `--pwfile=${passwordFile}`];
		args.push('-E', 'UTF8', '--locale=C.UTF-8', '--data-checksums', ...(throwaway ? ['--no-sync'] : []));
		await must('The database could not be made', ...asOwner(join(bin, 'initdb'), args, owner), HERE);
	} finally {
		rmSync(passwordFile, { force: true });
	}
	renameSync(unfinished, folder);
}

/**
 * The cluster's server, if it runs: by the id in postmaster.pid, believed only if that process is a PostgreSQL that was
 * started on this very folder.
 * @param {Pick<Cluster, 'folder'>} cluster
 */
export function runningServer({ folder }) {
	let lines;
	try {
		lines = readFileSync(join(folder, 'postmaster.pid'), 'utf8').split('\n');
	} catch {
		return null;
	}
	const identity = identify(Number(lines[0]));
	const words = identity ? commandLine(identity.pid) : [];
	if (!identity || !/\/postgres$/.test(words[0] ?? '') || words[words.indexOf('-D') + 1] !== folder) return null;
	return { identity, port: Number(lines[3]), ready: lines[7]?.trim() === 'ready' };
}

/**
 * Starts the cluster's server, or takes over the one that runs (left, for example, by a start command that was killed).
 * @param {Cluster} cluster
 * @param {{ throwaway?: boolean }} [options]
 * @returns {Promise<import('./processes.mjs').Identity>}
 */
export async function startCluster(cluster, { throwaway = false } = {}) {
	await makeCluster(cluster, throwaway);
	const { folder, bin, log, owner } = cluster;
	for (let waited = 0; waited < 120_000; waited += 100) {
		const server = runningServer(cluster);
		if (!server) break;
		if (server.ready) {
			cluster.port = server.port;
			remember(cluster);
			return server.identity;
		}
		await sleep(100);
	}
	await clearStalePid(folder);
	for (let attempt = 1; ; attempt++) {
		if ((await whyNot('127.0.0.1', cluster.port)) !== null) cluster.port = await freePort();
		remember(cluster);
		const options = (throwaway ? THROWAWAY : DURABLE).map((setting) => `-c ${setting}`).join(' ');
		const args = ['start', '-D', folder, '-l', log, '-w', '-t', '120', '-s', '-o'];
		args.push(`-h 127.0.0.1 -p ${cluster.port} -k '' ${options}`);
		const started = await run(...asOwner(join(bin, 'pg_ctl'), args, owner), HERE);
		const server = runningServer(cluster);
		if (server?.ready) return server.identity;
		// The port may have been taken meanwhile, and a killed server's last children may still be ending.
		if (attempt < 4) {
			await sleep(500);
			continue;
		}
		const words = existsSync(log) ? readFileSync(log, 'utf8') : started.output;
		throw new Trouble(`PostgreSQL did not start. The end of its log, ${log}:\n\n${lastLines(words, 15)}`);
	}
}

/**
 * PostgreSQL itself clears the pid file of a dead server, unless another process has the number by now. Then the file goes
 * here, but only when no server process of this cluster is left: two servers on one folder would destroy it.
 * @param {string} folder
 */
async function clearStalePid(folder) {
	const file = join(folder, 'postmaster.pid');
	for (let waited = 0; waited < 10_000 && processesIn(folder).length > 0; waited += 100) await sleep(100);
	if (!existsSync(file) || processesIn(folder).length > 0) return;
	const pid = Number(readFileSync(file, 'utf8').split('\n')[0]);
	// Also a dead one that nobody has collected yet counts as alive for PostgreSQL.
	if (existsSync(`/proc/${pid}`)) rmSync(file);
}

/**
 * @param {Cluster} cluster
 * @returns {Promise<boolean>} whether it stopped in good order
 */
export async function stopCluster({ folder, bin, owner }) {
	const server = runningServer({ folder });
	if (!server) return true;
	const args = ['stop', '-D', folder, '-m', 'fast', '-w', '-t', '60', '-s'];
	const stopped = await run(...asOwner(join(bin, 'pg_ctl'), args, owner), HERE);
	if (stopped.code === 0 || !isAlive(server.identity)) return true;
	// SIGQUIT is PostgreSQL's immediate shutdown: it recovers from its log at the next start.
	return endProcess(server.identity, { signal: 'SIGQUIT', seconds: 10 });
}

/**
 * Makes a database of that name if there is none.
 * @param {Cluster} cluster
 * @param {string} name
 */
export async function ensureDatabase({ bin, port, password }, name) {
	const env = { ...process.env, PGPASSWORD: password, PGCONNECT_TIMEOUT: '30' };
	const server = ['-h', '127.0.0.1', '-p', String(port), '-U', 'planish'];
	const query = ['-d', 'postgres', '-XAtc', `select 1 from pg_database where datname = '${name}'`];
	const found = await must('The database does not answer', join(bin, 'psql'), [...server, ...query], { ...HERE, env });
	if (found.stdout.trim() === '1') return;
	await must(`The database ${name} could not be made`, join(bin, 'createdb'), [...server, name], { ...HERE, env });
}
