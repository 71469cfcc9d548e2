/** Bodies of revolution for the tests, made with plain code. */
import type { TestMesh } from './surfaces';

/**
 * A surface of revolution about the x axis through profile points [x, r] in order of the flow (+x), each with r >= 0: a point
 * on the axis becomes one vertex, another a ring. Outward is to the left of the profile as seen in the plane with x to the
 * right and r upward.
 */
export function revolve(profile: readonly (readonly [number, number])[], sectors: number): TestMesh {
	const points: number[] = [];
	const triangles: number[] = [];
	/** First vertex of each profile point. */
	const first = profile.map(([x, r]) => {
		const at = points.length / 3;
		if (r === 0) points.push(x, 0, 0);
		else {
			for (let j = 0; j < sectors; j++) {
				const t = (2 * Math.PI * j) / sectors;
				points.push(x, r * Math.cos(t), r * Math.sin(t));
			}
		}
		return at;
	});
	const at = (k: number, j: number) => first[k] + (profile[k][1] === 0 ? 0 : j % sectors);
	for (let k = 0; k + 1 < profile.length; k++) {
		for (let j = 0; j < sectors; j++) {
			const [a, b, c, d] = [at(k, j), at(k, j + 1), at(k + 1, j + 1), at(k + 1, j)];
			if (a !== b) triangles.push(a, b, c);
			if (c !== d) triangles.push(a, c, d);
		}
	}
	return { positions: Float64Array.from(points), triangles: Uint32Array.from(triangles) };
}

/** Points between two profile points, the first included. */
export function between(
	[x0, r0]: readonly [number, number],
	[x1, r1]: readonly [number, number],
	pieces: number
): [number, number][] {
	return Array.from({ length: pieces }, (_, i) => {
		const t = i / pieces;
		return [x0 + t * (x1 - x0), r0 + t * (r1 - r0)];
	});
}
