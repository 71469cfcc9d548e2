/** Queries about design boxes, keep-outs and locks. A thing's definition is that of its newest version; no version is ever changed. */
import { QueryTypes, type ModelStatic } from 'sequelize';
import type { BoxCreate, KeepOutDefinition, LockCreate } from '$lib/api/schemas/drawn';
import { database } from '../db/client';
import {
	DesignBoxModel,
	DesignBoxVersionModel,
	KeepOutModel,
	KeepOutVersionModel,
	LockModel,
	LockVersionModel
} from '../db/models/drawn';
import type { Tx } from './transaction';

/** A thing in its newest version. */
export interface DrawnRow<Definition> {
	id: string;
	studyId: string;
	archivedAt: Date | null;
	version: number;
	definition: Definition;
	/** When the newest version was made. */
	updatedAt: Date;
}

/** The contents of an uploaded surface. */
export interface MeshContents {
	positionsId: string | null;
	trianglesId: string | null;
	originalId: string | null;
}

export class DrawnRepository<Definition extends object, More extends object = object> {
	/** @param extra columns of the owner's own, as `"name"` in SQL */
	constructor(
		private readonly owners: () => ModelStatic<DesignBoxModel>,
		private readonly versions: () => ModelStatic<DesignBoxVersionModel>,
		private readonly extra: string[] = []
	) {}

	#newest(): string {
		database();
		const columns = this.extra.map((name) => `, o.${snake(name)} AS "${name}"`).join('');
		return `
			SELECT o.id, o.study_id AS "studyId", o.archived_at AS "archivedAt", v.version, v.definition, v.created_at AS "updatedAt"
				${columns}
			FROM ${this.owners().getTableName() as string} o
			JOIN LATERAL (
				SELECT * FROM ${this.versions().getTableName() as string} WHERE owner_id = o.id ORDER BY version DESC LIMIT 1
			) v ON true`;
	}

	#select(where: string, bind: unknown[], tx?: Tx): Promise<(DrawnRow<Definition> & More)[]> {
		return database().query<DrawnRow<Definition> & More>(`${this.#newest()} ${where}`, {
			bind,
			type: QueryTypes.SELECT,
			transaction: tx
		});
	}

	/** A study's things that are not put away, the oldest first. */
	list(studyId: string, tx?: Tx): Promise<(DrawnRow<Definition> & More)[]> {
		return this.#select('WHERE o.study_id = $1 AND o.archived_at IS NULL ORDER BY o.created_at, o.id', [studyId], tx);
	}

	/** The thing, its row locked until the transaction ends; also one that is put away. */
	async lock(studyId: string, id: string, tx: Tx): Promise<(DrawnRow<Definition> & More) | null> {
		return (await this.#select('WHERE o.study_id = $1 AND o.id = $2 FOR UPDATE OF o', [studyId, id], tx))[0] ?? null;
	}

	/** Also one that is put away. */
	async find(id: string): Promise<(DrawnRow<Definition> & More) | null> {
		return (await this.#select('WHERE o.id = $1', [id]))[0] ?? null;
	}

	async insert(values: { studyId: string } & Partial<More>, tx: Tx): Promise<string> {
		database();
		return (await this.owners().create(values, { transaction: tx })).id;
	}

	async insertVersion(
		values: { ownerId: string; version: number; definition: Definition; createdBy: string | null },
		tx: Tx
	): Promise<void> {
		await this.versions().create(values, { transaction: tx });
	}

	async setArchived(id: string, archivedAt: Date | null, tx: Tx): Promise<void> {
		await this.owners().update({ archivedAt }, { where: { id }, transaction: tx });
	}
}

const snake = (name: string) => name.replace(/[A-Z]/g, (letter) => `_${letter.toLowerCase()}`);

export const boxes = new DrawnRepository<BoxCreate>(
	() => DesignBoxModel,
	() => DesignBoxVersionModel
);
export const keepOuts = new DrawnRepository<KeepOutDefinition, MeshContents>(
	() => KeepOutModel,
	() => KeepOutVersionModel,
	['positionsId', 'trianglesId', 'originalId']
);
export const locks = new DrawnRepository<LockCreate>(
	() => LockModel,
	() => LockVersionModel
);
