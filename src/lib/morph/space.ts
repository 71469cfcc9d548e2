import { MorphError } from './errors';
import { MovedSet } from './moved-set';
import type { BoxOperator } from './operator';
import type { PlaceRows } from './place-rows';
import { mirrorPartners, reflectVector } from './symmetry';
import type { Reduced, ReducedSystem } from './system';
import type { DesignBox, SymmetryPlane } from './types';

type Vec3 = [number, number, number];

/** The displacements that a move may have: a space of reduced vectors with the metric as its inner product. */
export interface MoveSpace {
	/** Vertices that may move, ascending. */
	readonly moved: Uint32Array;
	readonly unknowns: number;
	/** How near to each other two places are told apart, metres. */
	readonly spacing: number;
	/** moved.length: each vertex's mirror image among the moved, -1 where it has none; null without symmetry. */
	readonly partners: Int32Array | null;
	/** What the vertices' displacements see of a gradient (N x 3) in the reduced space. */
	row(gradient: Float64Array): Reduced;
	/** The same for the k-th of some places. */
	placeRow(rows: PlaceRows, k: number): Reduced;
	/** H^-1 of a row. */
	solve(row: Reduced): Reduced;
	/** The surface's displacement, moved x 3. */
	field(reduced: Reduced): Float64Array;
	/** The control points' displacements by box, nPoints x 3; none in surface mode. */
	lattices(reduced: Reduced): Float64Array[];
}

/** What a move keeps of a symmetry. */
export interface Mirror {
	normal: Vec3;
	/** N: 1 on the plane. */
	flags: Uint8Array;
	/** moved.length: each vertex's mirror image among the moved, -1 where it has none. */
	partners: Int32Array;
}

/** Makes a field symmetric to the last bit, which sums in another order are not quite. */
function mirrorField(field: Float64Array, { partners, normal }: Mirror): void {
	for (let i = 0; i < partners.length; i++) {
		const j = partners[i];
		if (j <= i) continue;
		const own: [number, number, number] = [field[3 * i], field[3 * i + 1], field[3 * i + 2]];
		const image = reflectVector([field[3 * j], field[3 * j + 1], field[3 * j + 2]], normal);
		const mean: [number, number, number] = [
			0.5 * (own[0] + image[0]),
			0.5 * (own[1] + image[1]),
			0.5 * (own[2] + image[2])
		];
		field.set(mean, 3 * i);
		field.set(reflectVector(mean, normal), 3 * j);
	}
}

/** Vertices on the symmetry plane lose the part of a field across it. */
export function keepOnPlane(field: Float64Array, moved: Uint32Array, flags: Uint8Array, [nx, ny, nz]: Vec3): void {
	for (let i = 0; i < moved.length; i++) {
		if (!flags[moved[i]]) continue;
		const across = field[3 * i] * nx + field[3 * i + 1] * ny + field[3 * i + 2] * nz;
		// An axis loses its component to the last bit, so that the vertex keeps its coordinate.
		field[3 * i] = nx === 1 ? 0 : field[3 * i] - across * nx;
		field[3 * i + 1] = ny === 1 ? 0 : field[3 * i + 1] - across * ny;
		field[3 * i + 2] = nz === 1 ? 0 : field[3 * i + 2] - across * nz;
	}
}

/** dx = W B T q: the control points of the boxes move the surface. */
export class LatticeSpace implements MoveSpace {
	readonly moved: Uint32Array;
	readonly unknowns: number;
	readonly spacing: number;
	private readonly set: MovedSet;
	private readonly plane: Mirror | null;

	constructor(
		private readonly operators: BoxOperator[],
		private readonly system: ReducedSystem,
		vertexCount: number,
		mirror: { positions: Float64Array; plane: SymmetryPlane; flags: Uint8Array; normal: Vec3 } | null
	) {
		this.set = new MovedSet(operators, vertexCount);
		this.moved = this.set.ids;
		this.unknowns = system.unknowns;
		this.plane = mirror && { ...mirror, partners: mirrorPartners(mirror.positions, this.moved, mirror.plane) };
		// A lattice cannot bend between its points, so places nearer than a part of their distance say nearly the same.
		this.spacing =
			0.35 * Math.min(...operators.flatMap(({ box }) => box.halfSize.map((h, d) => (2 * h) / (box.lattice[d] - 1))));
	}

	row(gradient: Float64Array): Reduced {
		return this.system.reduce(this.operators.map((op) => op.project(gradient)));
	}

	placeRow({ starts, vertices, vectors }: PlaceRows, k: number): Reduced {
		const lattices = this.operators.map((op) => new Float64Array(3 * op.pointCount));
		for (let t = starts[k]; t < starts[k + 1]; t++) {
			let [x, y, z] = [vectors[3 * t], vectors[3 * t + 1], vectors[3 * t + 2]];
			if (this.plane?.flags[vertices[t]]) {
				const n = this.plane.normal;
				const across = x * n[0] + y * n[1] + z * n[2];
				[x, y, z] = [x - across * n[0], y - across * n[1], z - across * n[2]];
			}
			this.operators.forEach((op, b) => op.projectVertex(vertices[t], x, y, z, lattices[b]));
		}
		return this.system.reduce(lattices);
	}

	solve(row: Reduced): Reduced {
		return this.system.solve(row);
	}

	field(reduced: Reduced): Float64Array {
		return this.ofLattices(this.system.expand(reduced));
	}

	lattices(reduced: Reduced): Float64Array[] {
		return this.system.expand(reduced);
	}

	get partners(): Int32Array | null {
		return this.plane?.partners ?? null;
	}

	/** The surface's displacement by lattice displacements, moved x 3. */
	ofLattices(lattices: Float64Array[]): Float64Array {
		const field = this.set.evaluate(lattices);
		if (this.plane) {
			keepOnPlane(field, this.moved, this.plane.flags, this.plane.normal);
			mirrorField(field, this.plane);
		}
		return field;
	}
}

/** The refusal of a box that meets nothing. */
export const emptyBox = (box: DesignBox) =>
	new MorphError(
		'box-empty',
		`Design box "${box.name ?? box.id}" holds no vertex of the surface.`,
		'Move or enlarge the box until it meets the surface.',
		{ box: box.name ?? box.id }
	);

/** The refusal of a box in which nothing may move. */
export const lockedBox = (box: DesignBox) =>
	new MorphError(
		'no-free-points',
		`Everything in design box "${box.name ?? box.id}" is locked.`,
		'Unlock a part of the surface in it, or leave the box out of the move.',
		{ box: box.name ?? box.id }
	);
