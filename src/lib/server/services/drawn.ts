/** The rules of what people draw into a study: every edit is a new version, and putting a thing away keeps them all. */
import type { StudyAccess } from '../auth/caller';
import { AppError } from '../errors';
import { recordEvent } from '../repositories/audit';
import type { DrawnRepository, DrawnRow } from '../repositories/drawn';
import { lockStudy, touchStudy } from '../repositories/studies';
import { inTransaction, type Tx } from '../repositories/transaction';

export class DrawnService<Definition extends { name: string }, More extends object, Answer> {
	/**
	 * @param noun as in "There is no such {noun}"
	 * @param action first part of its audit events
	 */
	constructor(
		private readonly repository: DrawnRepository<Definition, More>,
		private readonly noun: string,
		private readonly action: string,
		private readonly answer: (row: DrawnRow<Definition> & More) => Answer
	) {}

	async #lock({ studyId }: StudyAccess, id: string, tx: Tx): Promise<DrawnRow<Definition> & More> {
		const row = await this.repository.lock(studyId, id, tx);
		if (!row) throw new AppError('not-found', `There is no such ${this.noun}, or you have no part in its study.`);
		return row;
	}

	create(access: StudyAccess, definition: Definition): Promise<Answer> {
		const { studyId, userId } = access;
		return inTransaction(async (tx) => {
			const study = await lockStudy(studyId, tx);
			const ownerId = await this.repository.insert({ studyId } as { studyId: string } & Partial<More>, tx);
			await this.repository.insertVersion({ ownerId, version: 1, definition, createdBy: userId }, tx);
			await touchStudy(study, tx);
			const detail = { name: definition.name };
			await recordEvent(tx, access, { action: `${this.action}.created`, studyId, subjectId: ownerId, detail });
			return this.answer(await this.#lock(access, ownerId, tx));
		});
	}

	/**
	 * @param basedOn the version that the caller saw; undefined: whatever it is now
	 * @param check refuses a definition that the thing cannot take
	 * @throws AppError conflict when the thing is put away, or when somebody else has changed it since
	 */
	replace(
		access: StudyAccess,
		id: string,
		definition: Definition,
		{ basedOn, check }: { basedOn?: number; check?: (row: DrawnRow<Definition> & More) => void } = {}
	): Promise<Answer> {
		const { studyId, userId } = access;
		return inTransaction(async (tx) => {
			const study = await lockStudy(studyId, tx);
			const row = await this.#lock(access, id, tx);
			if (row.archivedAt) {
				throw new AppError('conflict', `The ${this.noun} was put away.`, {
					mend: 'Bring it back first, then change it.'
				});
			}
			if (basedOn !== undefined && basedOn !== row.version) {
				throw new AppError(
					'conflict',
					`Somebody else changed the ${this.noun} “${row.definition.name}”: it is at version ${row.version} now, and your ` +
						`change was made on version ${basedOn}.`,
					{ mend: 'Load it again, and make your change on what is there now.' }
				);
			}
			check?.(row);
			const version = row.version + 1;
			await this.repository.insertVersion({ ownerId: id, version, definition, createdBy: userId }, tx);
			await touchStudy(study, tx);
			const detail = { name: definition.name, version };
			await recordEvent(tx, access, { action: `${this.action}.replaced`, studyId, subjectId: id, detail });
			return this.answer(await this.#lock(access, id, tx));
		});
	}

	async #setArchived(access: StudyAccess, id: string, away: boolean): Promise<Answer> {
		const { studyId } = access;
		return inTransaction(async (tx) => {
			const study = await lockStudy(studyId, tx);
			const row = await this.#lock(access, id, tx);
			// Doing it twice is doing it once, and is recorded once.
			if (Boolean(row.archivedAt) !== away) {
				await this.repository.setArchived(id, away ? new Date() : null, tx);
				await touchStudy(study, tx);
				const action = `${this.action}.${away ? 'removed' : 'restored'}`;
				await recordEvent(tx, access, { action, studyId, subjectId: id, detail: { name: row.definition.name } });
			}
			return this.answer(row);
		});
	}

	readonly remove = (access: StudyAccess, id: string): Promise<Answer> => this.#setArchived(access, id, true);
	readonly restore = (access: StudyAccess, id: string): Promise<Answer> => this.#setArchived(access, id, false);
}
