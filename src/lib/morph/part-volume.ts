import { MorphError } from './errors';
import { edgeTable } from './half-edges';
import { boundsCentre, checkMesh, volumeGradient, volumeOf } from './surface';

/** A part of a body as a closed surface of its own: the chosen triangles, and a cap over each hole that they leave. */
export interface PartSurface {
	/** (N + caps) x 3: the body's vertices, then the caps' fixed points. Metres. */
	positions: Float64Array;
	/** The chosen triangles in the order given, then the caps' (fans to the fixed points). Closed. */
	triangles: Uint32Array;
	/** Boundary loops that were capped. */
	caps: number;
	/** m^3 */
	volume: number;
	/** N x 3, m^2: exact gradient of the volume by the body's vertices, the fixed points held. */
	gradient: Float64Array;
}

/**
 * The volume of the part of a body that chosen triangles bound. Each boundary loop is closed by a fan from its edges to one
 * point, the centroid of the loop's edges in these positions (the parent's), which stays where it is while the loop moves:
 * so the volume is a smooth function of the vertices, and by the divergence theorem it and its gradient are exact. Where a
 * loop lies in a plane, so does its cap.
 *
 * @param positions N x 3, metres, of the parent; borrowed
 * @param triangles F x 3; borrowed
 * @param selected triangle ids, each once
 * @throws MorphError part-invalid, mesh-shape, mesh-non-finite
 */
export function patchVolume(positions: Float64Array, triangles: Uint32Array, selected: Uint32Array): PartSurface {
	checkMesh(positions, triangles);
	const n = positions.length / 3;
	const chosen = chosenTriangles(triangles, selected);
	const loops = boundaryLoops(chosen, selected, n);
	const all = new Float64Array(positions.length + 3 * loops.length);
	all.set(positions);
	let edges = 0;
	for (const loop of loops) edges += loop.length;
	const closed = new Uint32Array(chosen.length + 3 * edges);
	closed.set(chosen);
	let at = chosen.length;
	loops.forEach((loop, i) => {
		all.set(centroid(positions, loop), 3 * (n + i));
		// The chosen triangle runs from a vertex to the next one; its cap runs back.
		loop.forEach((v, k) => {
			closed[at++] = loop[(k + 1) % loop.length];
			closed[at++] = v;
			closed[at++] = n + i;
		});
	});
	const origin = boundsCentre(all);
	return {
		positions: all,
		triangles: closed,
		caps: loops.length,
		volume: volumeOf(all, closed, origin),
		gradient: volumeGradient(all, closed, origin).slice(0, positions.length)
	};
}

function chosenTriangles(triangles: Uint32Array, selected: Uint32Array): Uint32Array {
	const faces = triangles.length / 3;
	if (selected.length === 0) {
		throw new MorphError('part-invalid', 'The part has no triangles.', 'Choose the triangles that bound it.');
	}
	const chosen = new Uint32Array(3 * selected.length);
	const seen = new Uint8Array(faces);
	selected.forEach((t, i) => {
		if (t >= faces || seen[t]) {
			throw new MorphError(
				'part-invalid',
				t >= faces
					? `The part names triangle ${t}, but the surface has only ${faces}.`
					: `The part names triangle ${t} twice.`,
				'Choose the part again on this surface.',
				{ triangle: t }
			);
		}
		seen[t] = 1;
		for (let k = 0; k < 3; k++) chosen[3 * i + k] = triangles[3 * t + k];
	});
	return chosen;
}

/** Vertices along each boundary of the chosen triangles, in the direction in which those run. */
function boundaryLoops(chosen: Uint32Array, selected: Uint32Array, n: number): number[][] {
	const edges = edgeTable(chosen, n);
	if (edges.crowdedCount > 0 || edges.againstCount > 0) {
		const triangle = selected[Math.floor((edges.crowdedCount > 0 ? edges.crowded : edges.against).indexOf(1) / 3)];
		throw new MorphError(
			'part-invalid',
			edges.crowdedCount > 0
				? `In the part, an edge of triangle ${triangle} belongs to more than two triangles.`
				: `In the part, triangle ${triangle} and a neighbour are oriented against each other.`,
			'Choose a part in which at most two triangles meet at an edge, oriented alike.',
			{ triangle }
		);
	}
	const next = new Map<number, number>();
	for (let e = 0; e < chosen.length; e++) {
		if (!edges.open[e]) continue;
		const from = chosen[e];
		if (next.has(from)) {
			throw new MorphError(
				'part-invalid',
				`The part's boundary meets itself at vertex ${from}, so that it can't be told which holes to close.`,
				'Add or leave out the triangles at that vertex, until the part meets itself along edges only.',
				{ vertex: from }
			);
		}
		next.set(from, chosen[e % 3 === 2 ? e - 2 : e + 1]);
	}
	const loops: number[][] = [];
	for (const start of next.keys()) {
		const loop: number[] = [];
		// One edge out of each boundary vertex means one into it: every chain closes.
		for (let v = start; next.has(v);) {
			const to = next.get(v) as number;
			loop.push(v);
			next.delete(v);
			v = to;
		}
		if (loop.length > 0) loops.push(loop);
	}
	return loops;
}

/** Of the loop's edges, by their length. */
function centroid(p: Float64Array, loop: number[]): number[] {
	const sum = [0, 0, 0];
	let total = 0;
	loop.forEach((v, k) => {
		const [a, b] = [3 * v, 3 * loop[(k + 1) % loop.length]];
		const length = Math.hypot(p[b] - p[a], p[b + 1] - p[a + 1], p[b + 2] - p[a + 2]);
		for (let d = 0; d < 3; d++) sum[d] += (length * (p[a + d] + p[b + d])) / 2;
		total += length;
	});
	if (total > 0) return sum.map((x) => x / total);
	return [p[3 * loop[0]], p[3 * loop[0] + 1], p[3 * loop[0] + 2]];
}
