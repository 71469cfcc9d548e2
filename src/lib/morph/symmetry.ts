import { boxAxes } from './box';
import { MorphError } from './errors';
import type { DesignBox, SymmetryPlane } from './types';

type Vec3 = [number, number, number];

/** Boxes that differ from their own mirror image by less than this share of their size are taken as symmetric. */
const SAME_BOX = 1e-6;
/** Vertices nearer to the plane than this share of the surface's extent lie on it: what float32 files can tell. */
const ON_PLANE = 1e-6;

/** @throws MorphError symmetry-invalid */
export function checkPlane(plane: SymmetryPlane): void {
	const numbers = [...plane.point, ...plane.normal];
	const length = Math.hypot(...plane.normal);
	if (numbers.length !== 6 || !numbers.every(Number.isFinite) || Math.abs(length - 1) > 1e-6) {
		throw new MorphError(
			'symmetry-invalid',
			'The symmetry plane is not a point and a unit normal.',
			'Give three finite coordinates and a normal of length 1.'
		);
	}
}

/** The unit normal, exact where it is an axis, so that mirrored coordinates are exact too. */
export function planeNormal({ normal }: SymmetryPlane): Vec3 {
	const length = Math.hypot(...normal);
	const unit = normal.map((x) => x / length) as Vec3;
	const axis = unit.findIndex((x) => Math.abs(Math.abs(x) - 1) < 1e-12);
	return axis < 0 ? unit : ([0, 1, 2].map((d) => (d === axis ? 1 : 0)) as Vec3);
}

/** v - 2 (v . n) n */
export function reflectVector(v: Vec3, n: Vec3): Vec3 {
	const s = 2 * (v[0] * n[0] + v[1] * n[1] + v[2] * n[2]);
	return [v[0] - s * n[0], v[1] - s * n[1], v[2] - s * n[2]];
}

const alongNormal = (p: readonly number[], plane: SymmetryPlane, n: Vec3) =>
	(p[0] - plane.point[0]) * n[0] + (p[1] - plane.point[1]) * n[1] + (p[2] - plane.point[2]) * n[2];

/** Which control point of a box's mirror image stands where each of the box's own is mirrored to. */
export interface Image {
	box: DesignBox;
	/** nPoints: index in the image's lattice. */
	points: Uint32Array;
}

function rotationOf(u: Vec3, v: Vec3, w: Vec3): [number, number, number, number] {
	// Columns u, v, w of a rotation to a quaternion, by the largest of the four squares (Shepperd 1978).
	const squares = [1 + u[0] - v[1] - w[2], 1 - u[0] + v[1] - w[2], 1 - u[0] - v[1] + w[2], 1 + u[0] + v[1] + w[2]];
	const k = squares.indexOf(Math.max(...squares));
	const s = 0.5 / Math.sqrt(squares[k]);
	const xy = u[1] + v[0];
	const xz = u[2] + w[0];
	const yz = v[2] + w[1];
	const q = [
		[squares[0], xy, xz, v[2] - w[1]],
		[xy, squares[1], yz, w[0] - u[2]],
		[xz, yz, squares[2], u[1] - v[0]],
		[v[2] - w[1], w[0] - u[2], u[1] - v[0], squares[3]]
	][k];
	return q.map((x) => x * s) as [number, number, number, number];
}

/**
 * A box's mirror image: its axes reflected, the one nearest to the plane's normal turned round so that they stay
 * right-handed; the lattice runs backwards along that one.
 */
export function mirrorBox(box: DesignBox, plane: SymmetryPlane): Image {
	const n = planeNormal(plane);
	const axes = boxAxes(box);
	const columns = [0, 1, 2].map((d) => [axes[3 * d], axes[3 * d + 1], axes[3 * d + 2]] as Vec3);
	const cosines = columns.map((c) => Math.abs(c[0] * n[0] + c[1] * n[1] + c[2] * n[2]));
	const turned = cosines.indexOf(Math.max(...cosines));
	const mirrored = columns.map((c, d) => {
		const r = reflectVector(c, n);
		return d === turned ? (r.map((x) => -x) as Vec3) : r;
	});
	const s = 2 * alongNormal(box.centre, plane, n);
	const [nu, nv, nw] = box.lattice;
	const points = new Uint32Array(nu * nv * nw);
	for (let i = 0, p = 0; i < nu; i++) {
		for (let j = 0; j < nv; j++) {
			for (let k = 0; k < nw; k++, p++) {
				const a = turned === 0 ? nu - 1 - i : i;
				const b = turned === 1 ? nv - 1 - j : j;
				const c = turned === 2 ? nw - 1 - k : k;
				points[p] = (a * nv + b) * nw + c;
			}
		}
	}
	const { u0, u1, v0, v1, w0, w1 } = box.held;
	const exact = cosines[turned] > 1 - 1e-12;
	return {
		points,
		box: {
			...box,
			centre: box.centre.map((x, d) => x - s * n[d]) as Vec3,
			rotation: exact ? box.rotation : rotationOf(mirrored[0], mirrored[1], mirrored[2]),
			held: {
				u0: turned === 0 ? u1 : u0,
				u1: turned === 0 ? u0 : u1,
				v0: turned === 1 ? v1 : v0,
				v1: turned === 1 ? v0 : v1,
				w0: turned === 2 ? w1 : w0,
				w1: turned === 2 ? w0 : w1
			},
			heldPoints: box.heldPoints && Array.from(box.heldPoints, (p) => points[p])
		}
	};
}

/** Whether two boxes take up the same place with the same lattice. */
function samePlace(a: DesignBox, b: DesignBox): boolean {
	const size = Math.max(...a.halfSize);
	const close = (x: readonly number[], y: readonly number[], unit: number) =>
		x.every((v, i) => Math.abs(v - y[i]) <= SAME_BOX * unit);
	const left = boxAxes(a);
	const right = boxAxes(b);
	return (
		close(a.centre, b.centre, size) &&
		close(a.halfSize, b.halfSize, size) &&
		close(Array.from(left), Array.from(right), 1) &&
		a.lattice.every((n, d) => n === b.lattice[d]) &&
		a.basis === b.basis &&
		(a.basis === 'bernstein' || (a.degree ?? 3) === (b.degree ?? 3))
	);
}

/** Two boxes whose lattices mirror each other; both the same for a box that is its own image. */
export interface Tie {
	box: number;
	image: number;
	/** nPoints of `box`: index in the lattice of `image`. */
	points: Uint32Array;
}

export interface TiedBoxes {
	/** The boxes as given (moved onto their exact mirror places where they nearly are), then images that none of them is. */
	boxes: DesignBox[];
	ties: Tie[];
	normal: Vec3;
}

/**
 * Finds for each box its mirror image among the boxes, or adds it.
 * @param plane of the study
 */
export function tieBoxes(given: DesignBox[], plane: SymmetryPlane): TiedBoxes {
	checkPlane(plane);
	const normal = planeNormal(plane);
	const boxes = given.slice();
	const ties: Tie[] = [];
	const done = new Set<number>();
	given.forEach((box, b) => {
		if (done.has(b)) return;
		done.add(b);
		let image = mirrorBox(box, plane);
		if (samePlace(box, image.box)) {
			// Onto the plane exactly, so that mirrored vertices have mirrored coordinates.
			const s = alongNormal(box.centre, plane, normal);
			const centred = { ...box, centre: box.centre.map((x, d) => x - s * normal[d]) as Vec3 };
			boxes[b] = centred;
			ties.push({ box: b, image: b, points: image.points });
			return;
		}
		const partner = given.findIndex((other, o) => o > b && !done.has(o) && samePlace(other, image.box));
		if (partner >= 0) {
			done.add(partner);
			image = mirrorBox(box, plane);
			boxes[partner] = { ...given[partner], centre: image.box.centre, rotation: image.box.rotation };
			ties.push({ box: b, image: partner, points: image.points });
			return;
		}
		boxes.push({ ...image.box, name: `${box.name ?? box.id}, mirrored` });
		ties.push({ box: b, image: boxes.length - 1, points: image.points });
	});
	return { boxes, ties, normal };
}

/**
 * Vertices on the plane: 1, others 0.
 * @param positions N x 3, metres
 */
export function onPlane(positions: Float64Array, plane: SymmetryPlane): Uint8Array {
	const n = planeNormal(plane);
	let low = Infinity;
	let high = -Infinity;
	for (let i = 0; i < positions.length; i++) {
		if (positions[i] < low) low = positions[i];
		if (positions[i] > high) high = positions[i];
	}
	const tolerance = ON_PLANE * (high - low);
	const out = new Uint8Array(positions.length / 3);
	for (let v = 0; v < out.length; v++) {
		const x = (positions[3 * v] - plane.point[0]) * n[0];
		const y = (positions[3 * v + 1] - plane.point[1]) * n[1];
		const z = (positions[3 * v + 2] - plane.point[2]) * n[2];
		if (Math.abs(x + y + z) <= tolerance) out[v] = 1;
	}
	return out;
}

/**
 * Which of some vertices are mirror images of each other.
 * @param moved ascending ids
 * @returns moved.length: position in `moved` of the image (its own, on the plane), -1 where there is none
 */
export function mirrorPartners(positions: Float64Array, moved: Uint32Array, plane: SymmetryPlane): Int32Array {
	const n = planeNormal(plane);
	let low = Infinity;
	let high = -Infinity;
	for (let i = 0; i < positions.length; i++) {
		if (positions[i] < low) low = positions[i];
		if (positions[i] > high) high = positions[i];
	}
	// Coordinates as float32 files give them, told apart well below their last place.
	const unit = 1e-9 * (high - low) || 1;
	const key = (x: number, y: number, z: number, k: number) => {
		// A vertex near the edge of a cell is looked for in the cell beside, too.
		const a = Math.floor(x / unit + (k & 1 ? 0.5 : 0));
		const b = Math.floor(y / unit + (k & 2 ? 0.5 : 0));
		const c = Math.floor(z / unit + (k & 4 ? 0.5 : 0));
		return `${a} ${b} ${c}`;
	};
	const out = new Int32Array(moved.length).fill(-1);
	for (let k = 0; k < 8; k++) {
		const index = new Map<string, number>();
		let missing = 0;
		for (let i = 0; i < moved.length; i++) {
			if (out[i] >= 0) continue;
			missing++;
			const v = 3 * moved[i];
			index.set(key(positions[v], positions[v + 1], positions[v + 2], k), i);
		}
		if (missing === 0) break;
		for (let i = 0; i < moved.length; i++) {
			if (out[i] >= 0) continue;
			const v = 3 * moved[i];
			const p = [positions[v], positions[v + 1], positions[v + 2]];
			const s = 2 * alongNormal(p, plane, n);
			const j = index.get(key(p[0] - s * n[0], p[1] - s * n[1], p[2] - s * n[2], k));
			if (j === undefined || (out[j] >= 0 && out[j] !== i)) continue;
			out[i] = j;
			out[j] = i;
		}
		// Most surfaces find all their pairs at once, or have few.
		if (k === 0 && missing > 0 && out.every((j) => j < 0)) break;
	}
	return out;
}
