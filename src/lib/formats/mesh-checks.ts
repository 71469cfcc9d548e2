/** A triangle mesh; borrowed. */
export interface HealthMesh {
	/** N x 3, file's unit. */
	positions: Float32Array;
	/** F x 3 */
	triangles: Uint32Array;
}

/** Triangles with two equal corners or exactly no area in float64. */
export function isDegenerate({ positions: p, triangles }: HealthMesh, t: number): boolean {
	const [i, j, k] = [triangles[3 * t], triangles[3 * t + 1], triangles[3 * t + 2]];
	if (i === j || j === k || k === i) return true;
	const [a, b, c] = [3 * i, 3 * j, 3 * k];
	const [ux, uy, uz] = [p[b] - p[a], p[b + 1] - p[a + 1], p[b + 2] - p[a + 2]];
	const [vx, vy, vz] = [p[c] - p[a], p[c + 1] - p[a + 1], p[c + 2] - p[a + 2]];
	return uy * vz - uz * vy === 0 && uz * vx - ux * vz === 0 && ux * vy - uy * vx === 0;
}

/**
 * Triangles over the vertices of an earlier one.
 * @returns for each the earlier triangle (-1: none) and whether the two look the same way
 */
export function findDuplicates(triangles: Uint32Array, vertexCount: number): { of: Int32Array; same: Uint8Array } {
	const faces = triangles.length / 3;
	const of = new Int32Array(faces).fill(-1);
	const same = new Uint8Array(faces);
	const head = new Int32Array(vertexCount).fill(-1);
	const next = new Int32Array(faces).fill(-1);
	const sorted = (t: number): [number, number, number] => {
		const [a, b, c] = [triangles[3 * t], triangles[3 * t + 1], triangles[3 * t + 2]];
		const low = Math.min(a, b, c);
		const high = Math.max(a, b, c);
		return [low, a + b + c - low - high, high];
	};
	/** Turns the lowest vertex to the front. */
	const second = (t: number) => {
		const low = sorted(t)[0];
		for (let k = 0; k < 3; k++) if (triangles[3 * t + k] === low) return triangles[3 * t + ((k + 1) % 3)];
		return -1;
	};
	// Lists by the middle vertex, not the lowest: the centre of a fan is often vertex 0.
	for (let t = 0; t < faces; t++) {
		const [low, middle, high] = sorted(t);
		if (low === middle || middle === high) continue;
		let found = -1;
		for (let o = head[middle]; o >= 0; o = next[o]) {
			const [a, , c] = sorted(o);
			if (a === low && c === high) {
				found = o;
				break;
			}
		}
		if (found >= 0) {
			of[t] = found;
			same[t] = second(found) === second(t) ? 1 : 0;
		} else {
			next[t] = head[middle];
			head[middle] = t;
		}
	}
	return { of, same };
}
