import { edgeTable, weldTriangles, type WithCheckpoint } from '$lib/morph';
import { countUnused } from './assemble';
import { countLoops } from './half-edges';
import { findDuplicates, isDegenerate, type HealthMesh } from './mesh-checks';
import { examineParts, type PartHealth } from './parts';
import { selfIntersections } from './self-intersection';

export type FindingCode =
	| 'open-edges'
	| 'non-manifold-edges'
	| 'inconsistent-edges'
	| 'inward-parts'
	| 'cavities'
	| 'degenerate-triangles'
	| 'duplicate-triangles'
	| 'double-sheets'
	| 'self-intersections'
	| 'separate-parts'
	| 'unused-vertices'
	| 'split-vertices'
	| 'unlikely-size';

export interface Finding {
	code: FindingCode;
	/** 'fault': the job suffers; 'look': it may be meant; 'note': good to know. */
	severity: 'fault' | 'look' | 'note';
	count: number;
	/** What it is and what it means for the job. */
	text: string;
	/** Triangle indices (vertex indices for unused and split vertices), the first 1000. */
	places: number[];
	/** Vertex pairs of the edges, two numbers each, the first 1000 edges; empty where the finding is none of edges. */
	edges: number[];
	/** The repair that mends it, if one is offered. */
	repair: 'reorient' | 'dropDegenerate' | 'dropDuplicates' | 'weld' | null;
}

export interface SurfaceHealth {
	findings: Finding[];
	/** No open, crowded or inconsistent edge. */
	closed: boolean;
	/** Chains of open edges that close. */
	openLoops: number;
	/** The first 1000 parts. */
	parts: PartHealth[];
	partCount: number;
	/** Share of the triangles that the search for self-intersections has looked at; 1: all. */
	intersectionsSearched: number;
}

export interface HealthOptions extends WithCheckpoint {
	/** Metres per unit of the positions, for the size; default 1. */
	metresPerUnit?: number;
	/** Milliseconds for self-intersections; 0 leaves them out; default 5000. */
	intersectionBudget?: number;
}

const LISTED = 1000;
/** Sizes of what this work is done on, metres. */
const LEAST_SIZE = 0.05;
const MOST_SIZE = 50;
const UNITS: [string, number][] = [
	['mm', 0.001],
	['cm', 0.01],
	['in', 0.0254],
	['m', 1]
];

function sizeFinding(mesh: HealthMesh, metresPerUnit: number): Finding | null {
	const low = [Infinity, Infinity, Infinity];
	const high = [-Infinity, -Infinity, -Infinity];
	// Of the used vertices only: stray ones say nothing of the size.
	for (const v of mesh.triangles) {
		for (let d = 0; d < 3; d++) {
			const x = mesh.positions[3 * v + d];
			if (x < low[d]) low[d] = x;
			if (x > high[d]) high[d] = x;
		}
	}
	const longest = Math.max(...high.map((h, d) => h - low[d]));
	const size = longest * metresPerUnit;
	if (!(size > 0) || (size >= LEAST_SIZE && size <= MOST_SIZE)) return null;
	const fitting = UNITS.filter(([, metres]) => longest * metres >= LEAST_SIZE && longest * metres <= MOST_SIZE);
	const hint = fitting
		.map(([unit, metres]) => `${(longest * metres).toPrecision(3)} m if the file is in ${unit}`)
		.join(', ');
	return {
		code: 'unlikely-size',
		severity: 'look',
		count: 1,
		text:
			`The surface is ${size.toPrecision(3)} m long in the study's unit; ${LEAST_SIZE} to ${MOST_SIZE} m is usual. ` +
			(hint ? `It would be ${hint}. ` : '') +
			'Step and smoothing length are in metres, so a wrong unit makes every move wrong.',
		places: [],
		edges: [],
		repair: null
	};
}

const plural = (n: number, one: string, many = `${one}s`) => `${n.toLocaleString('en-GB')} ${n === 1 ? one : many}`;

/**
 * Looks for what harms the job on a surface. Nothing is changed; see the repairs.
 * @returns findings with counts, places and words; only what was found
 */
export function surfaceHealth(mesh: HealthMesh, options: HealthOptions = {}): SurfaceHealth {
	const { positions, triangles } = mesh;
	const vertexCount = positions.length / 3;
	const faces = triangles.length / 3;
	const findings: Finding[] = [];
	const { checkpoint } = options;
	const find = (finding: Omit<Finding, 'edges' | 'places' | 'repair'> & Partial<Finding>) =>
		findings.push({ places: [], edges: [], repair: null, ...finding });
	const { of, parts, edges, untoldCavities } = examineParts(mesh);
	checkpoint?.(0.3);

	const listed = (flags: Uint8Array, once: boolean) => {
		const places: number[] = [];
		const pairs: number[] = [];
		const seen = new Set<number>();
		for (let e = 0; e < flags.length && pairs.length < 2 * LISTED; e++) {
			if (!flags[e]) continue;
			const [a, b] = [triangles[e], triangles[e % 3 === 2 ? e - 2 : e + 1]];
			const key = Math.min(a, b) * vertexCount + Math.max(a, b);
			if (once && seen.has(key)) continue;
			seen.add(key);
			pairs.push(a, b);
			places.push((e / 3) | 0);
		}
		return { places, edges: pairs };
	};

	const { loops, chains } = countLoops(triangles, edges);
	// Equal coordinates under several numbers: formats with indices split vertices at seams.
	const welded = weldTriangles(positions);
	const split = vertexCount - welded.positions.length / 3;
	if (edges.openCount > 0) {
		let closing = '';
		if (split > 0) {
			const after = edgeTable(
				Uint32Array.from(triangles, (v) => welded.triangles[v]),
				welded.positions.length / 3
			).openCount;
			closing =
				after === 0
					? ' All of them close when vertices of equal place are welded.'
					: ` ${after} are left when vertices of equal place are welded.`;
		}
		find({
			code: 'open-edges',
			severity: 'fault',
			count: edges.openCount,
			text:
				`${plural(edges.openCount, 'edge')} in ${plural(loops + chains, 'loop')} belong to one triangle only: the surface is open there. ` +
				`It encloses no volume, so volume cannot be held or bounded; moves work all the same.${closing}`,
			...listed(edges.open, false),
			repair: closing ? 'weld' : null
		});
	}
	if (edges.crowdedCount > 0) {
		find({
			code: 'non-manifold-edges',
			severity: 'fault',
			count: edges.crowdedCount,
			text: `${plural(edges.crowdedCount, 'edge')} join more than two triangles. There is no one outside at such an edge: normals, thickness and volume are not to be trusted there.`,
			...listed(edges.crowded, true)
		});
	}
	if (edges.againstCount > 0) {
		find({
			code: 'inconsistent-edges',
			severity: 'fault',
			count: edges.againstCount,
			text: `${plural(edges.againstCount, 'edge')} join triangles that face opposite ways. A map says what outward does: on flipped triangles a gain would become a loss.`,
			...listed(edges.against, true),
			repair: 'reorient'
		});
	}
	const inward = parts.filter((part) => part.closed && part.consistent && part.volume < 0 && !part.cavity);
	const untold =
		untoldCavities > 0 ? ` ${untoldCavities} of them may be walls of cavities: there were too many to tell.` : '';
	if (inward.length > 0) {
		find({
			code: 'inward-parts',
			severity: 'fault',
			count: inward.length,
			text: `${plural(inward.length, 'closed part')} face inward. There outward would mean inward: the surface would move the wrong way, and its volume counts as negative.${untold}`,
			places: inward.slice(0, LISTED).map((part) => part.firstTriangle),
			repair: 'reorient'
		});
	}
	const cavities = parts.filter((part) => part.cavity);
	if (cavities.length > 0) {
		find({
			code: 'cavities',
			severity: 'note',
			count: cavities.length,
			text: `${plural(cavities.length, 'part')} lie inside of another one and face inward, as the wall of a cavity does. Their volume is subtracted.`,
			places: cavities.slice(0, LISTED).map((part) => part.firstTriangle)
		});
	}
	const degenerate: number[] = [];
	let degenerateCount = 0;
	for (let t = 0; t < faces; t++) {
		if (!isDegenerate(mesh, t)) continue;
		degenerateCount++;
		if (degenerate.length < LISTED) degenerate.push(t);
	}
	if (degenerateCount > 0) {
		find({
			code: 'degenerate-triangles',
			severity: 'look',
			count: degenerateCount,
			text: `${plural(degenerateCount, 'triangle')} have no area. They have no normal and carry no sensitivity; some flow meshers stop at them.`,
			places: degenerate,
			repair: 'dropDegenerate'
		});
	}
	checkpoint?.(0.5);
	const duplicates = findDuplicates(triangles, vertexCount);
	const copies: number[] = [];
	const sheets: number[] = [];
	let copyCount = 0;
	let sheetCount = 0;
	for (let t = 0; t < faces; t++) {
		if (duplicates.of[t] < 0) continue;
		if (duplicates.same[t]) {
			copyCount++;
			if (copies.length < LISTED) copies.push(t);
		} else {
			sheetCount++;
			if (sheets.length < LISTED) sheets.push(t);
		}
	}
	if (copyCount > 0) {
		find({
			code: 'duplicate-triangles',
			severity: 'fault',
			count: copyCount,
			text: `${plural(copyCount, 'triangle')} repeat an earlier one. Their area counts twice in every map and every force.`,
			places: copies,
			repair: 'dropDuplicates'
		});
	}
	if (sheetCount > 0) {
		find({
			code: 'double-sheets',
			severity: 'look',
			count: sheetCount,
			text: `${plural(sheetCount, 'triangle')} lie back to back with an earlier one: a sheet of no thickness. Both sides move together, and outward has no meaning on it.`,
			places: sheets
		});
	}
	if (parts.length > 1) {
		find({
			code: 'separate-parts',
			severity: 'note',
			count: parts.length,
			text: `The surface has ${parts.length} separate parts. A box moves whatever part lies in it; lock those that must stay.`,
			places: parts.slice(0, LISTED).map((part) => part.firstTriangle)
		});
	}
	if (split > 0) {
		const seen = new Uint8Array(welded.positions.length / 3);
		const places: number[] = [];
		for (let v = 0; v < vertexCount && places.length < LISTED; v++) {
			if (seen[welded.triangles[v]]) places.push(v);
			seen[welded.triangles[v]] = 1;
		}
		find({
			code: 'split-vertices',
			severity: edges.openCount > 0 ? 'fault' : 'look',
			count: split,
			text: `${plural(split, 'vertex', 'vertices')} stand at the place of another one. The surface is cut there: what is smoothed does not cross the seam, and a move can tear it open.`,
			places,
			repair: 'weld'
		});
	}
	const unused = countUnused(vertexCount, triangles);
	if (unused > 0) {
		const used = new Uint8Array(vertexCount);
		for (const v of triangles) used[v] = 1;
		const places: number[] = [];
		for (let v = 0; v < vertexCount && places.length < LISTED; v++) if (!used[v]) places.push(v);
		find({
			code: 'unused-vertices',
			severity: 'note',
			count: unused,
			text: `${plural(unused, 'vertex', 'vertices')} belong to no triangle. They stay where they are and do no harm.`,
			places
		});
	}
	const size = sizeFinding(mesh, options.metresPerUnit ?? 1);
	if (size) findings.push(size);
	checkpoint?.(0.6);
	let searched = 0;
	const budget = options.intersectionBudget ?? 5000;
	if (budget > 0 && faces > 0) {
		const found = selfIntersections(mesh, budget, LISTED);
		searched = found.searched;
		if (found.count > 0) {
			find({
				code: 'self-intersections',
				severity: 'fault',
				count: found.count,
				text:
					`${plural(found.count, 'triangle')} pass through others${searched < 1 ? ' among those that there was time to look at' : ''}. ` +
					'Flow meshers usually stop there, and the enclosed volume is counted twice where parts overlap.',
				places: found.places
			});
		}
	}
	checkpoint?.(1);
	return {
		findings,
		closed: faces > 0 && edges.openCount + edges.crowdedCount + edges.againstCount === 0,
		openLoops: loops,
		parts: parts.slice(0, LISTED),
		partCount: of.length > 0 ? parts.length : 0,
		intersectionsSearched: searched
	};
}
