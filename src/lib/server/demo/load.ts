/** Walks the demo's plan through the product's own services and jobs, as a person would. */
import { boxCreate } from '$lib/api/schemas/drawn';
import { recipeRequest } from '$lib/api/schemas/moves';
import { objectiveCreate, studyCreate, type Study } from '$lib/api/schemas/studies';
import type { Actor, StudyAccess } from '../auth/caller';
import { sweep } from '../content/store';
import { withUpload } from '../content/upload';
import { recordEvent } from '../repositories/audit';
import { LOADED, lookForStudies, makeInvented, removeStudy } from '../repositories/demo';
import { findShape } from '../repositories/shapes';
import { inTransaction } from '../repositories/transaction';
import { boxService } from '../services/boxes';
import { waitForJob } from '../services/jobs';
import { checkMapImport, importMap } from '../services/maps';
import { putMember } from '../services/members';
import { readMesh } from '../services/mesh-cache';
import { commitMove } from '../services/moves';
import { createResult, getShape, importShape } from '../services/shapes';
import { createObjective, createStudy } from '../services/studies';
import { putPerson } from '../services/users';
import { demoPlan, type DemoBox, type DemoObjective } from './plan';

type ByObjective<T> = Record<DemoObjective, T>;

/**
 * Loads the demo into an installation that holds no study; one that an interrupted loading left half done is removed first.
 * Jobs must be running (startJobs).
 *
 * @param say told what happens, in a sentence each
 * @returns the demo's people; none when the installation has studies of its own and no demo
 */
export async function loadDemo(say: (sentence: string) => void): Promise<typeof demoPlan.users> {
	const { loaded, unfinished, others } = await lookForStudies();
	if (loaded) {
		say('The demo was loaded before.');
		return demoPlan.users;
	}
	if (others) {
		say('There are studies already: the demo is left out.');
		return [];
	}
	for (const studyId of unfinished) await inTransaction((tx) => removeStudy(studyId, tx));
	if (unfinished.length > 0) await sweep();
	const actor = await makePeople();
	const { study, access } = await makeStudy(actor);
	await new Walk(study, access, say).run();
	await inTransaction((tx) => recordEvent(tx, null, { action: LOADED, studyId: study.id, subjectId: study.id }));
	say('The demo is loaded.');
	return demoPlan.users;
}

/** @returns the engineer, who does everything in the plan */
async function makePeople(): Promise<Actor> {
	let engineer = '';
	for (const { role, name, email, password } of demoPlan.users) {
		const isAdmin = role === 'admin';
		const { user } = await putPerson({ email, name, password, isAdmin, firstPassword: password });
		if (role === 'engineer') engineer = user.id;
	}
	return { userId: engineer, tokenId: null };
}

async function makeStudy(actor: Actor): Promise<{ study: Study; access: StudyAccess }> {
	const caller = { ...actor, isAdmin: false, tokenStudyId: null };
	const study = await createStudy(caller, studyCreate.parse(demoPlan.study));
	const { name, yaw, weight } = demoPlan.operatingPoints[0];
	await makeInvented(study.id, { name, yaw: yaw ?? null, weight: weight ?? 1 });
	const access = { ...actor, studyId: study.id, role: 'engineer' as const };
	for (const { email, role } of demoPlan.users) {
		if (role === 'reviewer' || role === 'viewer') await putMember(access, email, role);
	}
	return { study, access };
}

/** The plan's cycles: maps and results of a shape, then the move to the next. */
class Walk {
	readonly #objectiveIds = {} as ByObjective<string>;
	readonly #boxIds = {} as Record<DemoBox, string>;
	/** By number. */
	readonly #shapeIds: string[] = [];
	readonly #found: ByObjective<number>[] = [];

	constructor(
		readonly study: Study,
		readonly access: StudyAccess,
		readonly say: (sentence: string) => void
	) {}

	async run(): Promise<void> {
		for (const { key, create } of demoPlan.objectives) {
			this.#objectiveIds[key] = (await createObjective(this.access, objectiveCreate.parse(create))).id;
		}
		for (const { key, create } of demoPlan.boxes) {
			this.#boxIds[key] = (await boxService.create(this.access, boxCreate.parse(create))).id;
		}
		await this.#baseline();
		for (let number = 0; number <= demoPlan.moves.length; number++) {
			this.say(`Demo: shape ${number} is stored.`);
			if (demoPlan.mappedShapes.includes(number)) await this.#maps(number);
			await this.#results(number);
			if (number < demoPlan.moves.length) await this.#move(number);
		}
	}

	async #done(jobId: string): Promise<Record<string, unknown>> {
		const job = await waitForJob(jobId);
		if (job.state === 'done' && job.result) return job.result;
		throw new Error(`The demo's job ${job.kind} ${job.state}: ${job.error?.detail ?? ''}`);
	}

	#upload<T>(filename: string, bytes: Uint8Array, work: Parameters<typeof withUpload<T>>[2]): Promise<T> {
		return withUpload(inPieces(bytes), { filename, announced: bytes.length }, work);
	}

	async #baseline(): Promise<void> {
		const { filename, name, bytes } = demoPlan.baseline;
		const jobId = await this.#upload(filename, bytes(), (upload) =>
			importShape(this.study.id, { filename, name }, upload, this.access)
		);
		this.#shapeIds[0] = (await this.#done(jobId)).shapeId as string;
	}

	async #maps(number: number): Promise<void> {
		const shapeId = this.#shapeIds[number];
		const mesh = await readMesh((await findShape(shapeId))!);
		for (const map of demoPlan.maps) {
			const filename = map.filename(number);
			const { kind, location, outward } = map;
			const query = { objectiveId: this.#objectiveIds[map.objective], filename, kind, location, outward };
			const checked = await checkMapImport(shapeId, query);
			const jobId = await this.#upload(filename, map.bytes(number, mesh), (upload) =>
				importMap(checked, upload, this.access)
			);
			await this.#done(jobId);
		}
	}

	async #results(number: number): Promise<void> {
		const { predicted } = await getShape(this.#shapeIds[number]);
		const move = demoPlan.moves[number - 1];
		const changes = {} as ByObjective<number>;
		for (const { key } of demoPlan.objectives) {
			const change = predicted.find(({ objectiveId }) => objectiveId === this.#objectiveIds[key])?.change;
			if (move && change == null) throw new Error(`The demo's shape ${number} has no prediction of ${key}.`);
			changes[key] = change ?? 0;
		}
		const results = demoPlan.results(number, move ? changes : null, move ? this.#found[move.parent] : null);
		const found = {} as ByObjective<number>;
		for (const { objective, ...result } of results) {
			found[objective] = result.value;
			const body = { objectiveId: this.#objectiveIds[objective], ...result };
			await createResult(this.#shapeIds[number], body, this.access);
		}
		this.#found[number] = found;
	}

	async #move(index: number): Promise<void> {
		const { parent, name, note, boxes, step, smoothing, constraints } = demoPlan.moves[index];
		const boxIds = boxes.map((key) => this.#boxIds[key]);
		const request = recipeRequest.parse({ boxIds, step, smoothing, constraints });
		const jobId = await commitMove(this.#shapeIds[parent], { ...request, name, note }, this.access);
		this.#shapeIds[index + 1] = (await this.#done(jobId)).shapeId as string;
	}
}

function* inPieces(bytes: Uint8Array): Generator<Uint8Array> {
	for (let at = 0; at < bytes.length; at += 1 << 20) yield bytes.subarray(at, at + (1 << 20));
}
