import { MorphError } from './errors';
import type { BoxOperator } from './operator';
import { reflectVector, type Tie } from './symmetry';

/** Two displacements that should mirror each other may differ by this share of the largest. */
const MIRROR_TOLERANCE = 1e-6;

/**
 * Displacements made by hand, by box in the engine's order: checked against what may move, images filled in.
 * @param hand by given box: nPoints x 3 metres, world axes, or null
 * @param given number of given boxes; the operators' further ones are mirror images
 * @param normal of the symmetry plane, with its ties
 * @throws MorphError hand-invalid
 */
export function handLattices(
	hand: (Float64Array | null)[],
	given: number,
	operators: BoxOperator[],
	ties: { list: Tie[]; normal: [number, number, number] } | null
): Float64Array[] {
	if (hand.length !== given) {
		throw new MorphError(
			'hand-invalid',
			`There are hand-made displacements for ${hand.length} boxes; the move has ${given}.`,
			'Give one list or null for every box of the move.'
		);
	}
	const lattices = operators.map((op, b) => {
		const label = op.box.name ?? op.box.id;
		const given = hand[b];
		const out = new Float64Array(3 * op.pointCount);
		if (!given) return out;
		if (given.length !== out.length || !given.every(Number.isFinite)) {
			throw new MorphError(
				'hand-invalid',
				`The displacement of design box "${label}" does not fit its lattice.`,
				'Give three finite numbers per control point, for every box.',
				{ box: label }
			);
		}
		for (let p = 0; p < op.pointCount; p++) {
			if (op.freeIndex[p] >= 0 || (given[3 * p] === 0 && given[3 * p + 1] === 0 && given[3 * p + 2] === 0)) continue;
			throw new MorphError(
				'hand-invalid',
				`Control point ${p} of design box "${label}" is held, and cannot be moved by hand.`,
				'Free its plane or the point itself, or leave it where it is.',
				{ box: label }
			);
		}
		out.set(given);
		return out;
	});
	for (const { box, image, points } of ties?.list ?? []) {
		if (image < 0) continue;
		const own = lattices[box];
		const other = lattices[image];
		const normal = (ties as { normal: [number, number, number] }).normal;
		const size = own.reduce((max, x) => Math.max(max, Math.abs(x)), 0);
		points.forEach((q, p) => {
			const mirrored = reflectVector([own[3 * p], own[3 * p + 1], own[3 * p + 2]], normal);
			if (image >= given) return other.set(mirrored, 3 * q);
			if (mirrored.every((x, d) => Math.abs(x - other[3 * q + d]) <= MIRROR_TOLERANCE * size)) return;
			const label = operators[box].box.name ?? operators[box].box.id;
			throw new MorphError(
				'hand-invalid',
				`The study is symmetric, but the hand-made displacement of design box "${label}" is not: control point ${p} and ` +
					`its mirror image ${q} differ.`,
				'Move both points of each mirrored pair alike, or turn the symmetry of the move off.',
				{ box: label }
			);
		});
	}
	return lattices;
}
