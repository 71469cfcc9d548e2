import { boxAxes } from './box';
import { MorphError } from './errors';
import { PlaceRowsBuilder, type PlaceConstraint } from './place-rows';
import { cutsBetween } from './keep-out-cuts';
import { SignedDistance, type DistanceField } from './signed-distance';
import { TriangleTree } from './triangle-tree';

/** Space that the surface must stay out of, or stay in. Metres, the study's frame. */
export type KeepOutGeometry =
	| {
			kind: 'halfSpace';
			point: readonly [number, number, number];
			/** Unit normal out of the half. */
			normal: readonly [number, number, number];
	  }
	| {
			kind: 'box';
			centre: readonly [number, number, number];
			halfSize: readonly [number, number, number];
			/** Unit quaternion [x, y, z, w] that turns the world's axes into the box's. */
			rotation: readonly [number, number, number, number];
	  }
	| {
			kind: 'mesh';
			/** N x 3; borrowed and kept. */
			positions: Float64Array;
			/** F x 3, closed, counter-clockwise seen from outside; borrowed and kept. */
			triangles: Uint32Array;
	  };

/** Where the surface belongs: outside the geometry (a keep-out), or inside it (an envelope). */
export type KeepOutSide = 'outside' | 'inside';

export interface PreparedKeepOut {
	readonly geometry: KeepOutGeometry;
	readonly side: KeepOutSide;
	/** Metres, >= 0. */
	readonly clearance: number;
	/**
	 * Signed distances of points to the geometry's surface, positive on the allowed side; the clearance is not taken off.
	 * @param points n x 3; borrowed
	 * @param limit distances above it are given as the limit, with the gradient (0, 0, 0); all below it are exact
	 * @param outDistance n; written
	 * @param outGradient n x 3, unit vectors along which the distance grows; written
	 */
	distance(points: Float64Array, n: number, limit: number, outDistance: Float64Array, outGradient: Float64Array): void;
	/** Distance >= clearance at these vertices. */
	place(vertices: Uint32Array): PlaceConstraint;
	/**
	 * How near some triangles come to the geometry, and whether they cut it between their vertices.
	 * @param positions N x 3, metres; borrowed
	 * @param triangles F x 3; borrowed
	 * @param chosen triangle ids, ascending
	 * @param tolerance metres by which vertices may miss the clearance
	 * @param sag metres by which a triangle may cut the geometry between its vertices
	 */
	penetration(
		positions: Float64Array,
		triangles: Uint32Array,
		chosen: Uint32Array,
		tolerance: number,
		sag: number
	): Penetration;
}

export interface Penetration {
	/** Smallest signed distance found, metres; null without a chosen triangle. */
	distance: number | null;
	/** Where it was found. */
	position: [number, number, number] | null;
	/** A chosen triangle there. */
	triangle: number;
	/** Vertices nearer than the clearance less the tolerance. */
	vertices: number;
	/** Triangles that cut deeper than the sag, though their vertices keep the clearance. */
	cuts: number;
}

class HalfSpaceField implements DistanceField {
	distance = 0;
	readonly gx: number;
	readonly gy: number;
	readonly gz: number;
	private readonly offset: number;

	constructor(geometry: Extract<KeepOutGeometry, { kind: 'halfSpace' }>) {
		[this.gx, this.gy, this.gz] = geometry.normal;
		const p = geometry.point;
		this.offset = this.gx * p[0] + this.gy * p[1] + this.gz * p[2];
	}

	at(x: number, y: number, z: number): void {
		this.distance = this.gx * x + this.gy * y + this.gz * z - this.offset;
	}
}

/** Distance to an oriented box in closed form; inside, to its nearest face. */
class BoxField implements DistanceField {
	distance = 0;
	gx = 0;
	gy = 0;
	gz = 0;
	/** Rows: the box's axes in the world. */
	private readonly m: Float64Array;

	constructor(private readonly geometry: Extract<KeepOutGeometry, { kind: 'box' }>) {
		this.m = boxAxes(geometry);
	}

	at(x: number, y: number, z: number): void {
		const { m } = this;
		const { centre, halfSize } = this.geometry;
		const rx = x - centre[0];
		const ry = y - centre[1];
		const rz = z - centre[2];
		const u = m[0] * rx + m[1] * ry + m[2] * rz;
		const v = m[3] * rx + m[4] * ry + m[5] * rz;
		const w = m[6] * rx + m[7] * ry + m[8] * rz;
		const a = Math.abs(u) - halfSize[0];
		const b = Math.abs(v) - halfSize[1];
		const c = Math.abs(w) - halfSize[2];
		let du = 0;
		let dv = 0;
		let dw = 0;
		if (a > 0 || b > 0 || c > 0) {
			if (a > 0) du = u < 0 ? -a : a;
			if (b > 0) dv = v < 0 ? -b : b;
			if (c > 0) dw = w < 0 ? -c : c;
			const d = Math.sqrt(du * du + dv * dv + dw * dw);
			this.distance = d;
			du /= d;
			dv /= d;
			dw /= d;
		} else if (a >= b && a >= c) {
			this.distance = a;
			du = u < 0 ? -1 : 1;
		} else if (b >= c) {
			this.distance = b;
			dv = v < 0 ? -1 : 1;
		} else {
			this.distance = c;
			dw = w < 0 ? -1 : 1;
		}
		this.gx = m[0] * du + m[3] * dv + m[6] * dw;
		this.gy = m[1] * du + m[4] * dv + m[7] * dw;
		this.gz = m[2] * du + m[5] * dv + m[8] * dw;
	}
}

const UNIT = 1e-6;

function refuse(message: string, mend: string): never {
	throw new MorphError('keep-out-invalid', message, mend);
}

function checkNumbers(name: string, values: readonly number[], length: number): void {
	if (values.length !== length || !values.every(Number.isFinite)) {
		refuse(`The keep-out's ${name} is not a list of ${length} finite numbers.`, `Give ${length} finite numbers.`);
	}
}

function fieldOf(geometry: KeepOutGeometry): DistanceField {
	if (geometry.kind === 'halfSpace') {
		checkNumbers('point', geometry.point, 3);
		checkNumbers('normal', geometry.normal, 3);
		const length = Math.hypot(...geometry.normal);
		if (Math.abs(length - 1) > UNIT) {
			refuse(
				`The half-space's normal has the length ${length.toPrecision(6)}.`,
				'Give a unit vector that points out of the half.'
			);
		}
		return new HalfSpaceField(geometry);
	}
	if (geometry.kind === 'box') {
		checkNumbers('centre', geometry.centre, 3);
		checkNumbers('half-size', geometry.halfSize, 3);
		checkNumbers('rotation', geometry.rotation, 4);
		if (!geometry.halfSize.every((h) => h > 0)) {
			refuse('A half-size of the keep-out box is not positive.', 'Give half-sizes above 0.');
		}
		const length = Math.hypot(...geometry.rotation);
		if (Math.abs(length - 1) > UNIT) {
			refuse(`The rotation has the length ${length.toPrecision(6)}.`, 'Give a unit quaternion [x, y, z, w].');
		}
		return new BoxField(geometry);
	}
	if (geometry.kind === 'mesh') return new SignedDistance(geometry.positions, geometry.triangles);
	return refuse(
		`Keep-outs of the kind "${String((geometry as { kind: unknown }).kind)}" are not known.`,
		'Use halfSpace, box or mesh.'
	);
}

/**
 * A keep-out, or with the side 'inside' an envelope, ready for questions about distances. Half-spaces and boxes in closed
 * form; meshes by SignedDistance.
 * @param clearance metres between the geometry and the surface, >= 0
 * @throws MorphError keep-out-invalid, keep-out-open, mesh-shape, mesh-non-finite
 */
export function prepareKeepOut(geometry: KeepOutGeometry, side: KeepOutSide, clearance: number): PreparedKeepOut {
	if (!Number.isFinite(clearance) || clearance < 0) {
		refuse(`The clearance ${clearance} is no length.`, 'Give 0 or more metres.');
	}
	if (side !== 'outside' && side !== 'inside') {
		refuse(`The side "${String(side)}" is not known.`, 'Use outside or inside.');
	}
	return new KeepOut(geometry, side, clearance, fieldOf(geometry));
}

class KeepOut implements PreparedKeepOut {
	constructor(
		readonly geometry: KeepOutGeometry,
		readonly side: KeepOutSide,
		readonly clearance: number,
		private readonly field: DistanceField
	) {}

	distance(points: Float64Array, n: number, limit: number, outDistance: Float64Array, outGradient: Float64Array): void {
		const { field } = this;
		const sign = this.side === 'outside' ? 1 : -1;
		const low = sign > 0 ? -Infinity : -limit;
		const high = sign > 0 ? limit : Infinity;
		for (let i = 0; i < n; i++) {
			field.at(points[3 * i], points[3 * i + 1], points[3 * i + 2], low, high);
			const d = sign * field.distance;
			const beyond = d > limit;
			outDistance[i] = beyond ? limit : d;
			outGradient[3 * i] = beyond ? 0 : sign * field.gx;
			outGradient[3 * i + 1] = beyond ? 0 : sign * field.gy;
			outGradient[3 * i + 2] = beyond ? 0 : sign * field.gz;
		}
	}

	place(vertices: Uint32Array): PlaceConstraint {
		const { field, clearance } = this;
		const sign = this.side === 'outside' ? 1 : -1;
		return {
			rows: (positions, within) => {
				const builder = new PlaceRowsBuilder();
				const limit = clearance + within;
				const low = sign > 0 ? -Infinity : -limit;
				const high = sign > 0 ? limit : Infinity;
				for (let i = 0; i < vertices.length; i++) {
					const v = 3 * vertices[i];
					field.at(positions[v], positions[v + 1], positions[v + 2], low, high);
					const d = sign * field.distance;
					if (!(d < limit)) continue;
					builder.term(vertices[i], sign * field.gx, sign * field.gy, sign * field.gz);
					builder.place(d - clearance, d);
				}
				return builder.rows();
			}
		};
	}

	/** The geometry's surface, where a triangle with all its vertices on the right side can still cut it. */
	private surfaceTree(): TriangleTree | null {
		const { geometry, field } = this;
		if (field instanceof SignedDistance) return field.triangleTree;
		// A half-space, and a box from inside, are convex on the allowed side.
		if (geometry.kind !== 'box' || this.side === 'inside') return null;
		return boxTree(geometry);
	}

	penetration(
		positions: Float64Array,
		triangles: Uint32Array,
		chosen: Uint32Array,
		tolerance: number,
		sag: number
	): Penetration {
		const { field, clearance } = this;
		const sign = this.side === 'outside' ? 1 : -1;
		const result: Penetration = { distance: null, position: null, triangle: -1, vertices: 0, cuts: 0 };
		const seen = new Uint8Array(positions.length / 3);
		const broken = new Set<number>();
		// Nothing farther than the nearest so far matters, unless it lacks clearance: that keeps the search short.
		let nearest = Infinity;
		for (let i = 0; i < chosen.length; i++) {
			for (let k = 0; k < 3; k++) {
				const v = triangles[3 * chosen[i] + k];
				if (seen[v]) continue;
				seen[v] = 1;
				const limit = Math.max(nearest, clearance);
				const [x, y, z] = [positions[3 * v], positions[3 * v + 1], positions[3 * v + 2]];
				field.at(x, y, z, sign > 0 ? -Infinity : -limit, sign > 0 ? limit : Infinity);
				const d = sign * field.distance;
				if (d < clearance - tolerance) broken.add(v);
				if (!(d < nearest)) continue;
				nearest = d;
				result.distance = d;
				result.triangle = chosen[i];
				result.position = [x, y, z];
			}
		}
		result.vertices = broken.size;
		const tree = this.surfaceTree();
		if (tree) {
			for (const cut of cutsBetween(positions, triangles, chosen, broken, tree, this.field, sign, sag)) {
				result.cuts++;
				if (result.distance !== null && cut.distance >= result.distance) continue;
				result.distance = cut.distance;
				result.position = cut.position;
				result.triangle = cut.triangle;
			}
		}
		return result;
	}
}

/** Twelve triangles on the box. */
function boxTree(geometry: Extract<KeepOutGeometry, { kind: 'box' }>): TriangleTree {
	const m = boxAxes(geometry);
	const positions = new Float64Array(24);
	for (let i = 0; i < 8; i++) {
		for (let d = 0; d < 3; d++) {
			positions[3 * i + d] = geometry.centre[d];
			for (let k = 0; k < 3; k++) positions[3 * i + d] += ((i >> k) & 1 ? 1 : -1) * geometry.halfSize[k] * m[3 * k + d];
		}
	}
	const faces: number[] = [];
	for (let d = 0; d < 3; d++) {
		const [u, v, w] = [1 << d, 1 << ((d + 1) % 3), 1 << ((d + 2) % 3)];
		faces.push(0, v + w, v, 0, w, v + w, u, u + v, u + v + w, u, u + v + w, u + w);
	}
	return new TriangleTree(positions, Uint32Array.from(faces));
}
