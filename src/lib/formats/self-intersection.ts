import { Box3, BufferAttribute, BufferGeometry } from 'three';
import { MeshBVH } from 'three-mesh-bvh';
import type { HealthMesh } from './mesh-checks';

/** Relative size below which six times a tetrahedron's volume counts as zero: touching is not crossing. */
const FLAT = 1e-10;
const CLOCK_EVERY = 256;

/** Six times the signed volume of (a, b, c, d), zeroed where it is within roundoff of the cube of `size`. */
function orient(p: Float32Array, a: number, b: number, c: number, d: number, size: number): number {
	const [ux, uy, uz] = [p[b] - p[a], p[b + 1] - p[a + 1], p[b + 2] - p[a + 2]];
	const [vx, vy, vz] = [p[c] - p[a], p[c + 1] - p[a + 1], p[c + 2] - p[a + 2]];
	const [wx, wy, wz] = [p[d] - p[a], p[d + 1] - p[a + 1], p[d + 2] - p[a + 2]];
	const det = ux * (vy * wz - vz * wy) + uy * (vz * wx - vx * wz) + uz * (vx * wy - vy * wx);
	return Math.abs(det) <= FLAT * size * size * size ? 0 : det;
}

/** Whether the segment d-e crosses the inside of the triangle a, b, c (offsets into p). */
function pierces(p: Float32Array, d: number, e: number, a: number, b: number, c: number, size: number): boolean {
	const from = orient(p, a, b, c, d, size);
	const to = orient(p, a, b, c, e, size);
	if (!(from * to < 0)) return false;
	const x = orient(p, d, e, a, b, size);
	const y = orient(p, d, e, b, c, size);
	const z = orient(p, d, e, c, a, size);
	return (x > 0 && y > 0 && z > 0) || (x < 0 && y < 0 && z < 0);
}

/**
 * Triangles that properly cross another one: an edge of one passes through the inside of the other. Touching, and lying in
 * one plane, is not counted; neighbours over an edge are not compared.
 * @param budget milliseconds, after which the search ends and says how far it came
 */
export function selfIntersections(
	mesh: HealthMesh,
	budget: number,
	listed: number
): { count: number; places: number[]; searched: number } {
	const { positions: p, triangles } = mesh;
	const faces = triangles.length / 3;
	const begin = performance.now();
	const geometry = new BufferGeometry();
	geometry.setAttribute('position', new BufferAttribute(p, 3));
	geometry.setIndex(new BufferAttribute(triangles, 1));
	// Indirect: the tree sorts its own list and leaves the mesh's triangle order alone.
	const tree = new MeshBVH(geometry, { indirect: true });
	const hit = new Uint8Array(faces);
	const box = new Box3();
	const corner = (t: number, k: number) => 3 * triangles[3 * t + k];
	const equal = (a: number, b: number) => a === b || (p[a] === p[b] && p[a + 1] === p[b + 1] && p[a + 2] === p[b + 2]);
	const cross = (s: number, t: number, size: number): boolean => {
		let shared = 0;
		let sharedS = -1;
		let sharedT = -1;
		for (let i = 0; i < 3; i++) {
			for (let j = 0; j < 3; j++) {
				if (!equal(corner(s, i), corner(t, j))) continue;
				shared++;
				sharedS = i;
				sharedT = j;
			}
		}
		if (shared > 1) return false;
		for (let k = 0; k < 3; k++) {
			// With a common corner only the edges opposite to it can cross.
			if (sharedS < 0 || k === (sharedS + 1) % 3) {
				if (pierces(p, corner(s, k), corner(s, (k + 1) % 3), corner(t, 0), corner(t, 1), corner(t, 2), size))
					return true;
			}
			if (sharedT < 0 || k === (sharedT + 1) % 3) {
				if (pierces(p, corner(t, k), corner(t, (k + 1) % 3), corner(s, 0), corner(s, 1), corner(s, 2), size))
					return true;
			}
		}
		return false;
	};
	let searched = faces;
	for (let t = 0; t < faces; t++) {
		if (t % CLOCK_EVERY === 0 && performance.now() - begin > budget) {
			searched = t;
			break;
		}
		box.makeEmpty();
		for (let k = 0; k < 3; k++) {
			const c = corner(t, k);
			box.min.set(Math.min(box.min.x, p[c]), Math.min(box.min.y, p[c + 1]), Math.min(box.min.z, p[c + 2]));
			box.max.set(Math.max(box.max.x, p[c]), Math.max(box.max.y, p[c + 1]), Math.max(box.max.z, p[c + 2]));
		}
		const size = Math.max(box.max.x - box.min.x, box.max.y - box.min.y, box.max.z - box.min.z);
		tree.shapecast({
			intersectsBounds: (other) => box.intersectsBox(other),
			intersectsRange: (offset, count) => {
				for (let i = offset; i < offset + count; i++) {
					const other = tree.resolveTriangleIndex(i);
					if (other <= t || (hit[t] && hit[other])) continue;
					if (cross(t, other, size)) {
						hit[t] = 1;
						hit[other] = 1;
					}
				}
				return false;
			}
		});
	}
	const places: number[] = [];
	let count = 0;
	for (let t = 0; t < faces; t++) {
		if (!hit[t]) continue;
		count++;
		if (places.length < listed) places.push(t);
	}
	return { count, places, searched: faces > 0 ? searched / faces : 1 };
}
