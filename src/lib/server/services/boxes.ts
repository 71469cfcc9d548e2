/** Design boxes. */
import type { Box, BoxCreate } from '$lib/api/schemas/drawn';
import { boxes, type DrawnRow } from '../repositories/drawn';
import { DrawnService } from './drawn';

export function boxAnswer(row: DrawnRow<BoxCreate>): Box {
	const { name, centre, halfSize, rotation, lattice, basis, degree, held, axes, frame } = row.definition;
	return {
		id: row.id,
		studyId: row.studyId,
		version: row.version,
		name,
		centre,
		halfSize,
		rotation,
		lattice,
		basis,
		...(degree !== undefined && { degree }),
		held,
		// Boxes from before single points could be held have none.
		heldPoints: row.definition.heldPoints ?? [],
		axes,
		frame,
		updatedAt: row.updatedAt.toISOString()
	};
}

export const boxService = new DrawnService(boxes, 'design box', 'box', boxAnswer);
