import type { CheckResult, MoveChecks, WithCheckpoint } from './types';

export interface CheckMoveInput extends WithCheckpoint {
	/** N x 3 of the parent, any unit; borrowed. */
	before: ArrayLike<number>;
	/** N x 3 of the child, same unit; borrowed. */
	after: ArrayLike<number>;
	/** F x 3 */
	triangles: Uint32Array;
	/** Look only at triangles with a vertex among these; default all. */
	moved?: Uint32Array;
	/** Degrees; default 3 (common practice for surface meshes of flow solvers). */
	minAngle?: number;
	/** Whether breaking the smallest angle blocks the commit; default false. */
	minAngleHard?: boolean;
	/** Metres per unit of the positions, for the places; default 1. */
	metresPerUnit?: number;
}

const DEFAULT_MIN_ANGLE = 3;

/**
 * Looks at the moved triangles: those that flipped (normal turned by 90 degrees or more against the parent) and the
 * smallest interior angle. Triangles without area in the parent are left out: they have neither normal nor angles.
 */
export function checkMove(input: CheckMoveInput): MoveChecks {
	const { before, after, triangles, moved } = input;
	let mark: Uint8Array | null = null;
	if (moved) {
		mark = new Uint8Array(before.length / 3);
		for (let i = 0; i < moved.length; i++) mark[moved[i]] = 1;
	}
	const limit = input.minAngle ?? DEFAULT_MIN_ANGLE;
	const limitCosine = Math.cos((limit * Math.PI) / 180);
	let flipped = 0;
	let worstTurn = Infinity;
	let worstFlip = -1;
	let largestCosine = -Infinity;
	let worstAngle = -1;
	let narrow = 0;
	for (let i = 0; i < triangles.length; i += 3) {
		const va = triangles[i];
		const vb = triangles[i + 1];
		const vc = triangles[i + 2];
		if (mark && !(mark[va] | mark[vb] | mark[vc])) continue;
		const a = 3 * va;
		const b = 3 * vb;
		const c = 3 * vc;
		// Edges a->b, a->c before the move.
		const px = before[b] - before[a];
		const py = before[b + 1] - before[a + 1];
		const pz = before[b + 2] - before[a + 2];
		const qx = before[c] - before[a];
		const qy = before[c + 1] - before[a + 1];
		const qz = before[c + 2] - before[a + 2];
		const nx = py * qz - pz * qy;
		const ny = pz * qx - px * qz;
		const nz = px * qy - py * qx;
		if (nx === 0 && ny === 0 && nz === 0) continue;
		const ux = after[b] - after[a];
		const uy = after[b + 1] - after[a + 1];
		const uz = after[b + 2] - after[a + 2];
		const vx = after[c] - after[a];
		const vy = after[c + 1] - after[a + 1];
		const vz = after[c + 2] - after[a + 2];
		const turn = nx * (uy * vz - uz * vy) + ny * (uz * vx - ux * vz) + nz * (ux * vy - uy * vx);
		if (!(turn > 0)) {
			flipped++;
			if (!(turn >= worstTurn)) {
				worstTurn = turn;
				worstFlip = i / 3;
			}
		}
		const uu = ux * ux + uy * uy + uz * uz;
		const vv = vx * vx + vy * vy + vz * vz;
		const uv = ux * vx + uy * vy + uz * vz;
		const ww = uu + vv - 2 * uv;
		const lu = Math.sqrt(uu);
		const lv = Math.sqrt(vv);
		const lw = Math.sqrt(ww > 0 ? ww : 0);
		// Cosines at a, b, c; the largest belongs to the smallest angle.
		const cosA = uv / (lu * lv);
		const cosB = (uu - uv) / (lu * lw);
		const cosC = (vv - uv) / (lv * lw);
		let cosine = cosA > cosB ? cosA : cosB;
		if (cosC > cosine) cosine = cosC;
		// Collapsed edges give no number: the angle there is 0.
		if (!(cosine <= 1)) cosine = 1;
		if (cosine > limitCosine) narrow++;
		if (cosine > largestCosine) {
			largestCosine = cosine;
			worstAngle = i / 3;
		}
	}
	input.checkpoint?.(1);
	const place = (triangle: number): CheckResult['place'] => {
		if (triangle < 0) return null;
		const position: [number, number, number] = [0, 0, 0];
		for (let k = 0; k < 3; k++) {
			const v = 3 * triangles[3 * triangle + k];
			for (let d = 0; d < 3; d++) position[d] += ((input.metresPerUnit ?? 1) * after[v + d]) / 3;
		}
		return { triangle, position };
	};
	const angle = worstAngle < 0 ? 60 : (Math.acos(Math.min(1, Math.max(-1, largestCosine))) * 180) / Math.PI;
	return {
		flipped: { value: flipped, limit: 0, ok: flipped === 0, hard: true, count: flipped, place: place(worstFlip) },
		minAngle: {
			value: angle,
			limit,
			ok: angle >= limit,
			hard: input.minAngleHard ?? false,
			count: narrow,
			place: place(worstAngle)
		}
	};
}
