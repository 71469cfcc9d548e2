import { BufferAttribute, BufferGeometry, Vector3 } from 'three';
import { MeshBVH } from 'three-mesh-bvh';
import type { HealthMesh } from './mesh-checks';

/** x' = scale * (axes x) + shift, in the mesh's unit. */
export interface FrameTransform {
	/** 3 x 3, row by row: a signed permutation of the axes. */
	axes: number[];
	scale: number;
	shift: [number, number, number];
}

/** A mend for a map that does not lie on the surface. */
export interface FrameFix {
	transform: FrameTransform;
	/** What is wrong and what the mend does, in words. */
	text: string;
	/** Share (0..1) of the looked-at points on the surface before and after. */
	before: number;
	after: number;
	/** Median distance after, in the mesh's unit. */
	median: number;
	/** How many things the mend changes (unit, axes, place): of equals the simplest comes first. */
	changes: number;
}

export interface FrameOptions {
	/** Distance within which a point counts as on the surface; default half the mean edge, at most 1 % of the diagonal. */
	tolerance?: number;
	/** Points looked at; default 1500. */
	sample?: number;
}

const SAMPLE = 1500;
const QUICK_SAMPLE = 120;
/** Points after which a hopeless candidate is left; they are spread over the file like all samples. */
const FIRST_LOOK = 24;
/** A map with this share on the surface needs no doctor. */
const WELL = 0.95;
const LEAST_SHARE = 0.5;
const LEAST_GAIN = 0.15;
const ROUNDS = 25;

const SCALES: [number, string][] = [
	[1, ''],
	[0.001, 'The map is in millimetres where the surface is in metres'],
	[1000, 'The map is in metres where the surface is in millimetres'],
	[1 / 25.4, 'The map is in millimetres where the surface is in inches'],
	[25.4, 'The map is in inches where the surface is in millimetres'],
	[0.0254, 'The map is in inches where the surface is in metres'],
	[1 / 0.0254, 'The map is in metres where the surface is in inches'],
	[0.01, 'The map is in centimetres where the surface is in metres'],
	[100, 'The map is in metres where the surface is in centimetres'],
	[0.1, 'The map is in millimetres where the surface is in centimetres'],
	[10, 'The map is in centimetres where the surface is in millimetres'],
	[2.54, 'The map is in inches where the surface is in centimetres'],
	[1 / 2.54, 'The map is in centimetres where the surface is in inches']
];

const AXIS = ['x', 'y', 'z'];

interface AxesCase {
	axes: number[];
	text: string;
	changes: number;
}

/** The identity, then mirrors and exchanges of axes from the likelier to the rarer: all 48 signed permutations. */
function axesCases(): AxesCase[] {
	const cases: AxesCase[] = [];
	const orders = [
		[0, 1, 2],
		[0, 2, 1],
		[1, 0, 2],
		[2, 1, 0],
		[1, 2, 0],
		[2, 0, 1]
	];
	for (const order of orders) {
		for (let signs = 0; signs < 8; signs++) {
			const axes = new Array<number>(9).fill(0);
			const rows = order.map((from, row) => {
				const minus = (signs >> row) & 1;
				axes[3 * row + from] = minus ? -1 : 1;
				return `${minus ? '-' : ''}${AXIS[from]}`;
			});
			const moved = order.filter((from, row) => from !== row).length;
			const flipped = rows.filter((row) => row[0] === '-').length;
			let text = '';
			if (moved === 0 && flipped === 1) text = `The map is mirrored in ${rows.find((row) => row[0] === '-')![1]}`;
			else if (moved === 0 && flipped === 2) {
				text = `The map is turned by half a turn about ${rows.find((row) => row[0] !== '-')}`;
			} else if (moved > 0 || flipped > 0) text = `The map's axes (x, y, z) are the surface's (${inverse(axes)})`;
			cases.push({ axes, text, changes: (moved > 0 ? 1 : 0) + flipped / 4 + (moved === 3 ? 0.5 : 0) });
		}
	}
	return cases.sort((a, b) => a.changes - b.changes);
}

/** Which surface axis each map axis is: the columns of a signed permutation. */
function inverse(axes: number[]): string {
	return [0, 1, 2]
		.map((column) => {
			const row = [0, 1, 2].find((r) => axes[3 * r + column] !== 0)!;
			return `${axes[3 * row + column] < 0 ? '-' : ''}${AXIS[row]}`;
		})
		.join(', ');
}

/** Points through a transform. */
export function applyFrame(points: ArrayLike<number>, { axes, scale, shift }: FrameTransform): Float64Array {
	const out = new Float64Array(points.length);
	for (let i = 0; i < out.length; i += 3) {
		for (let d = 0; d < 3; d++) {
			const turned = axes[3 * d] * points[i] + axes[3 * d + 1] * points[i + 1] + axes[3 * d + 2] * points[i + 2];
			out[i + d] = scale * turned + shift[d];
		}
	}
	return out;
}

/** Vectors turn with the axes; they are neither scaled nor shifted: their unit is the objective's, not a length's. */
export const applyFrameToVectors = (vectors: ArrayLike<number>, { axes }: FrameTransform): Float64Array =>
	applyFrame(vectors, { axes, scale: 1, shift: [0, 0, 0] });

function boundsOf(p: ArrayLike<number>): { min: number[]; max: number[] } {
	const min = [Infinity, Infinity, Infinity];
	const max = [-Infinity, -Infinity, -Infinity];
	for (let i = 0; i < p.length; i++) {
		const d = i % 3;
		if (p[i] < min[d]) min[d] = p[i];
		if (p[i] > max[d]) max[d] = p[i];
	}
	return { min, max };
}

function meanEdge({ positions: p, triangles }: HealthMesh): number {
	let sum = 0;
	const step = 3 * Math.max(1, Math.floor(triangles.length / 3 / 20000));
	let count = 0;
	for (let t = 0; t < triangles.length; t += step) {
		const [a, b] = [3 * triangles[t], 3 * triangles[t + 1]];
		sum += Math.hypot(p[b] - p[a], p[b + 1] - p[a + 1], p[b + 2] - p[a + 2]);
		count++;
	}
	return sum / Math.max(1, count);
}

const gcd = (a: number, b: number): number => (b === 0 ? a : gcd(b, a % b));

/** Every k-th point, so that all parts of the file are seen. */
function thin(points: ArrayLike<number>, count: number): Float64Array {
	const n = points.length / 3;
	const take = Math.min(n, count);
	const out = new Float64Array(3 * take);
	// A stride coprime to the count visits all of them in a spread order, so that the first few stand for the rest.
	let stride = Math.max(1, Math.floor(take * 0.618));
	while (gcd(stride, take) !== 1) stride++;
	for (let i = 0; i < take; i++) {
		const from = Math.floor((((i * stride) % take) * n) / take);
		for (let d = 0; d < 3; d++) out[3 * i + d] = points[3 * from + d];
	}
	return out;
}

/** Distances of points to the surface, and the vectors from them to it. */
class Nearest {
	private readonly tree: MeshBVH;
	private readonly point = new Vector3();
	private readonly hit = { point: new Vector3(), distance: 0, faceIndex: 0 };

	constructor(mesh: HealthMesh) {
		const geometry = new BufferGeometry();
		geometry.setAttribute('position', new BufferAttribute(mesh.positions, 3));
		geometry.setIndex(new BufferAttribute(mesh.triangles, 1));
		this.tree = new MeshBVH(geometry, { indirect: true });
	}

	/** Share of points within the tolerance; gives up early where the first of them are nearly all elsewhere. */
	share(points: Float64Array, tolerance: number): number {
		const n = points.length / 3;
		let near = 0;
		for (let i = 0; i < n; i++) {
			this.point.fromArray(points, 3 * i);
			// The search ends at the tolerance: a far point costs little.
			const hit = this.tree.closestPointToPoint(this.point, this.hit, 0, tolerance * (1 + 1e-9));
			if (hit && hit.distance <= tolerance) near++;
			if (i + 1 === FIRST_LOOK && near < FIRST_LOOK / 6) return near / (i + 1);
		}
		return near / n;
	}

	look(points: Float64Array): { distance: Float64Array; towards: Float64Array } {
		const distance = new Float64Array(points.length / 3);
		const towards = new Float64Array(points.length);
		for (let i = 0; i < distance.length; i++) {
			this.point.fromArray(points, 3 * i);
			this.tree.closestPointToPoint(this.point, this.hit);
			distance[i] = this.hit.distance;
			this.hit.point.sub(this.point).toArray(towards, 3 * i);
		}
		return { distance, towards };
	}
}

const median = (values: Float64Array) => values.slice().sort()[values.length >> 1];

/**
 * Looks for why a map's points do not lie on the surface: another length unit, mirrored or exchanged axes, a constant
 * shift, and each of these together. Candidates are scored by the share of a sample of the points that then lies on the
 * surface; shifts are found by laying bounds on bounds and refined by the mean way to the surface (the translation part
 * of iterated closest points, Besl and McKay 1992).
 * @param points M x 3, borrowed
 * @param mesh in the unit in which the points should be
 * @returns the mends that help, the best first; none when the map lies well already
 */
export function suspectFrame(points: ArrayLike<number>, mesh: HealthMesh, options: FrameOptions = {}): FrameFix[] {
	if (points.length === 0 || mesh.triangles.length === 0) return [];
	const meshBounds = boundsOf(mesh.positions);
	const size = meshBounds.max.map((high, d) => high - meshBounds.min[d]);
	const diagonal = Math.hypot(...size);
	const tolerance = options.tolerance ?? Math.min(0.5 * meanEdge(mesh), 0.01 * diagonal);
	const sample = thin(points, options.sample ?? SAMPLE);
	const quick = thin(sample, QUICK_SAMPLE);
	const nearest = new Nearest(mesh);
	const before = nearest.share(sample, tolerance);
	if (before >= WELL) return [];
	const whole = boundsOf(points);
	const cases = axesCases();

	interface Candidate {
		transform: FrameTransform;
		words: string[];
		changes: number;
		score: number;
	}
	const candidates: Candidate[] = [];
	const fits = (bounds: { min: number[]; max: number[] }) =>
		size.every((s, d) => bounds.max[d] - bounds.min[d] <= 1.05 * s + 2 * tolerance);
	const consider = (transform: FrameTransform, words: string[], changes: number) => {
		const score = nearest.share(applyFrame(quick, transform), tolerance);
		candidates.push({ transform, words: words.filter(Boolean), changes, score });
	};
	for (const [scale, unit] of SCALES) {
		for (const axesCase of cases) {
			const plain: FrameTransform = { axes: axesCase.axes, scale, shift: [0, 0, 0] };
			const corners = applyFrame([...whole.min, ...whole.max], plain);
			const bounds = boundsOf(corners);
			// Larger than the surface, or far smaller than a map would be: no candidate with any shift.
			if (!fits(bounds)) continue;
			const extent = Math.hypot(...bounds.max.map((high, d) => high - bounds.min[d]));
			if (extent < 0.05 * diagonal) continue;
			const changes = (scale === 1 ? 0 : 1) + axesCase.changes;
			const words = [unit, axesCase.text];
			const overlaps = [0, 1, 2].every(
				(d) => bounds.max[d] >= meshBounds.min[d] - tolerance && bounds.min[d] <= meshBounds.max[d] + tolerance
			);
			if (overlaps && changes > 0) consider(plain, words, changes);
			for (const align of ['min', 'max', 'centre'] as const) {
				const shift = [0, 1, 2].map((d) => {
					if (align === 'min') return meshBounds.min[d] - bounds.min[d];
					if (align === 'max') return meshBounds.max[d] - bounds.max[d];
					return (meshBounds.min[d] + meshBounds.max[d] - bounds.min[d] - bounds.max[d]) / 2;
				}) as [number, number, number];
				if (Math.hypot(...shift) <= tolerance) continue;
				consider({ ...plain, shift }, words, changes + 1);
			}
		}
	}
	candidates.sort((a, b) => b.score - a.score || a.changes - b.changes);
	const fixes: FrameFix[] = [];
	for (const candidate of candidates.slice(0, 12)) {
		const shifted = candidate.transform.shift.some((s) => s !== 0);
		const transform = shifted ? refine(nearest, quick, candidate.transform, tolerance) : candidate.transform;
		const moved = applyFrame(sample, transform);
		const after = nearest.share(moved, tolerance);
		if (after < LEAST_SHARE || after < before + LEAST_GAIN) continue;
		const words = [...candidate.words];
		if (shifted) {
			// The map's own offset, before the mend.
			const offset = transform.shift.map((s) => Number((-s).toPrecision(4)));
			words.push(`The map is shifted by (${offset.join(', ')}) in the surface's unit`);
		}
		fixes.push({
			transform,
			text: `${words.join('. ')}. With that put right, ${Math.round(100 * after)} % of the points lie on the surface; now ${Math.round(100 * before)} % do.`,
			before,
			after,
			median: median(nearest.look(moved).distance),
			changes: candidate.changes
		});
	}
	// What differs by less than a few points of the sample is equal, and the simpler one is likelier.
	const grade = (fix: FrameFix) => Math.round(30 * fix.after);
	fixes.sort((a, b) => grade(b) - grade(a) || a.changes - b.changes || a.median - b.median);
	const best = fixes[0];
	return fixes.filter((fix, k) => k < 4 && fix.after > best.after - 0.3);
}

function refine(nearest: Nearest, points: Float64Array, start: FrameTransform, tolerance: number): FrameTransform {
	let transform = start;
	for (let round = 0; round < ROUNDS; round++) {
		const { towards } = nearest.look(applyFrame(points, transform));
		const mean = [0, 0, 0];
		for (let i = 0; i < towards.length; i++) mean[i % 3] += (3 * towards[i]) / towards.length;
		const shift = transform.shift.map((s, d) => s + mean[d]) as [number, number, number];
		transform = { ...transform, shift };
		if (Math.hypot(...mean) < 1e-4 * tolerance) break;
	}
	return transform;
}
