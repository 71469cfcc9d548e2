/** Small surfaces and boxes for the engine's tests, made with plain code. */
import type { DesignBox, Surface } from '$lib/morph';
import { makeSurface } from '$lib/morph';
import { icosphere } from '../../../bench/workload';

export { icosphere };

/** A vertex grid on a closed (u, v) parameter surface; `wrap` joins the ends. */
export function gridSurface(
	nu: number,
	nv: number,
	point: (u: number, v: number) => [number, number, number]
): { positions: Float64Array; triangles: Uint32Array } {
	const positions = new Float64Array(3 * nu * nv);
	for (let i = 0; i < nu; i++) for (let j = 0; j < nv; j++) positions.set(point(i / nu, j / nv), 3 * (i * nv + j));
	const triangles: number[] = [];
	for (let i = 0; i < nu; i++) {
		for (let j = 0; j < nv; j++) {
			const a = i * nv + j;
			const b = ((i + 1) % nu) * nv + j;
			const c = ((i + 1) % nu) * nv + ((j + 1) % nv);
			const d = i * nv + ((j + 1) % nv);
			triangles.push(a, b, c, a, c, d);
		}
	}
	return { positions, triangles: Uint32Array.from(triangles) };
}

/** A closed body of revolution about x from a profile r(s), x(s) with r = 0 at both ends; outward normals. */
export function revolution(
	rings: number,
	sectors: number,
	profile: (s: number) => [number, number]
): { positions: Float64Array; triangles: Uint32Array } {
	const points: number[] = [];
	const triangles: number[] = [];
	points.push(profile(0)[0], 0, 0);
	for (let i = 1; i < rings; i++) {
		const [x, r] = profile(i / rings);
		for (let j = 0; j < sectors; j++) {
			const t = (2 * Math.PI * j) / sectors;
			points.push(x, r * Math.cos(t), r * Math.sin(t));
		}
	}
	points.push(profile(1)[0], 0, 0);
	const last = points.length / 3 - 1;
	const at = (i: number, j: number) => 1 + (i - 1) * sectors + (j % sectors);
	for (let j = 0; j < sectors; j++) {
		triangles.push(0, at(1, j + 1), at(1, j));
		for (let i = 1; i < rings - 1; i++) {
			triangles.push(at(i, j), at(i, j + 1), at(i + 1, j + 1), at(i, j), at(i + 1, j + 1), at(i + 1, j));
		}
		triangles.push(at(rings - 1, j), at(rings - 1, j + 1), last);
	}
	return { positions: Float64Array.from(points), triangles: Uint32Array.from(triangles) };
}

/** The unit cube's surface, each face split into k x k squares. */
export function cube(k: number): { positions: Float64Array; triangles: Uint32Array } {
	const ids = new Map<string, number>();
	const points: number[] = [];
	const triangles: number[] = [];
	const vertex = (p: number[]) => {
		const key = p.join();
		let id = ids.get(key);
		if (id === undefined) {
			id = points.length / 3;
			ids.set(key, id);
			points.push(...p.map((x) => x / k));
		}
		return id;
	};
	for (let d = 0; d < 3; d++) {
		for (const side of [0, k]) {
			for (let i = 0; i < k; i++) {
				for (let j = 0; j < k; j++) {
					const corner = (a: number, b: number) => {
						const p = [0, 0, 0];
						p[d] = side;
						p[(d + 1) % 3] = a;
						p[(d + 2) % 3] = b;
						return vertex(p);
					};
					const [p, q, r, s] = [corner(i, j), corner(i + 1, j), corner(i + 1, j + 1), corner(i, j + 1)];
					if (side) triangles.push(p, q, r, p, r, s);
					else triangles.push(p, r, q, p, s, r);
				}
			}
		}
	}
	return { positions: Float64Array.from(points), triangles: Uint32Array.from(triangles) };
}

/** An ellipsoid from the icosphere. */
export function ellipsoid(level: number, axes: [number, number, number]): Surface {
	const { positions, triangles } = icosphere(level);
	return makeSurface(
		positions.map((x, i) => x * axes[i % 3]),
		triangles
	);
}

export function makeBox(more: Partial<DesignBox> = {}): DesignBox {
	return {
		id: 'a',
		centre: [0, 0, 0],
		halfSize: [1, 1, 1],
		rotation: [0, 0, 0, 1],
		lattice: [4, 4, 4],
		basis: 'bernstein',
		held: { u0: 0, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 },
		axes: ['x', 'y', 'z'],
		frame: 'box',
		...more
	};
}

/** Unit quaternion of a turn by `angle` about `axis`. */
export function turn(axis: [number, number, number], angle: number): [number, number, number, number] {
	const n = Math.hypot(...axis);
	const s = Math.sin(angle / 2) / n;
	return [axis[0] * s, axis[1] * s, axis[2] * s, Math.cos(angle / 2)];
}

/** Smooth invented nodal gradient on a surface: density cos(3x) sin(2y + 0.4) + 0.3 z, as in the standard workload. */
export function smoothGradient(surface: Surface, k = 3): Float64Array {
	const out = new Float64Array(surface.positions.length);
	for (let v = 0; v < surface.mass.length; v++) {
		const [x, y, z] = surface.positions.subarray(3 * v, 3 * v + 3);
		const s = surface.mass[v] * (Math.cos(k * x) * Math.sin(2 * y + 0.4) + 0.3 * z);
		for (let d = 0; d < 3; d++) out[3 * v + d] = s * surface.normals[3 * v + d];
	}
	return out;
}

export const largest = (values: ArrayLike<number>) => {
	let max = 0;
	for (let i = 0; i < values.length; i++) max = Math.max(max, Math.abs(values[i]));
	return max;
};
