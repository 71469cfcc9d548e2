import { MorphError, type MapTable } from '$lib/morph';
import { nonFinite, shown } from './errors';
import type { NamedArray, SurfaceFile } from './types';

/** What a dialog shows of an array that may be a map. */
export interface ArrayChoice {
	name: string;
	on: NamedArray['on'];
	/** 1 or 3: others are no maps. */
	components: number;
	usable: boolean;
	/** Over all numbers that are finite. */
	min: number;
	max: number;
	/** Values that are not finite. */
	nonFinite: number;
}

export function listArrays(surface: SurfaceFile): ArrayChoice[] {
	return surface.arrays.map(({ name, on, components, values }) => {
		let min = Infinity;
		let max = -Infinity;
		let bad = 0;
		for (let i = 0; i < values.length; i++) {
			const value = values[i];
			if (!Number.isFinite(value)) bad++;
			else {
				if (value < min) min = value;
				if (value > max) max = value;
			}
		}
		const usable = (components === 1 || components === 3) && bad === 0 && values.length > 0;
		return { name, on, components, usable, min, max, nonFinite: bad };
	});
}

export interface MapArrayOptions {
	name: string;
	on: NamedArray['on'];
	/**
	 * Whether a cell's value is a total (a derivative) that its triangles share by area, or a density that each has.
	 */
	total: boolean;
}

/**
 * A point or cell array as a table of points for matching. Point arrays: one row a vertex, in file order. Cell arrays: one
 * row a triangle at its centroid, in file order.
 * @throws MorphError map-shape when there is no such array or it has neither one nor three components; file-non-finite
 */
export function mapFromArray(surface: SurfaceFile, options: MapArrayOptions): MapTable {
	const array = surface.arrays.find((a) => a.name === options.name && a.on === options.on);
	if (!array) {
		const names = surface.arrays.map((a) => `"${shown(a.name)}" (${a.on})`);
		throw new MorphError(
			'map-shape',
			`The file has no ${options.on} array "${shown(options.name)}".`,
			names.length > 0
				? `Choose one of ${names.slice(0, 12).join(', ')}.`
				: 'Export the map with its arrays: this file has none.'
		);
	}
	const n = array.components;
	if (n !== 1 && n !== 3) {
		throw new MorphError(
			'map-shape',
			`The array "${shown(array.name)}" has ${n} components; a map has 1 or 3.`,
			'Choose another array, or split it where it was made.'
		);
	}
	const bad = array.values.findIndex((value) => !Number.isFinite(value));
	if (bad >= 0) {
		const at = Math.floor(bad / n);
		throw nonFinite(
			`The ${array.on} array "${shown(array.name)}" holds a value that is not finite at ${array.on} ${at}.`,
			array.on === 'point' ? { vertex: at } : { triangle: at }
		);
	}
	const { positions, triangles, polygonOfTriangle } = surface;
	if (array.on === 'point') {
		const rows = positions.length / 3;
		return {
			points: Float64Array.from(positions),
			values: array.values.slice(),
			components: n,
			rows,
			lines: new Uint32Array(rows),
			header: [array.name]
		};
	}
	const rows = triangles.length / 3;
	const points = new Float64Array(3 * rows);
	const values = new Float64Array(n * rows);
	const areas = options.total && polygonOfTriangle ? triangleAreas(surface) : null;
	const whole = areas ? new Float64Array(array.values.length / n) : null;
	const count = whole ? new Uint32Array(whole.length) : null;
	if (areas && whole && count && polygonOfTriangle) {
		for (let t = 0; t < rows; t++) {
			whole[polygonOfTriangle[t]] += areas[t];
			count[polygonOfTriangle[t]]++;
		}
	}
	for (let t = 0; t < rows; t++) {
		const cell = polygonOfTriangle ? polygonOfTriangle[t] : t;
		for (let d = 0; d < 3; d++) {
			for (let k = 0; k < 3; k++) points[3 * t + d] += positions[3 * triangles[3 * t + k] + d] / 3;
		}
		// A polygon without area shares alike.
		const share = areas && whole && count ? (whole[cell] > 0 ? areas[t] / whole[cell] : 1 / count[cell]) : 1;
		for (let c = 0; c < n; c++) values[n * t + c] = share * array.values[n * cell + c];
	}
	return { points, values, components: n, rows, lines: new Uint32Array(rows), header: [array.name] };
}

function triangleAreas({ positions: p, triangles }: SurfaceFile): Float64Array {
	const out = new Float64Array(triangles.length / 3);
	for (let t = 0; t < out.length; t++) {
		const [a, b, c] = [3 * triangles[3 * t], 3 * triangles[3 * t + 1], 3 * triangles[3 * t + 2]];
		const [ux, uy, uz] = [p[b] - p[a], p[b + 1] - p[a + 1], p[b + 2] - p[a + 2]];
		const [vx, vy, vz] = [p[c] - p[a], p[c + 1] - p[a + 1], p[c + 2] - p[a + 2]];
		out[t] = 0.5 * Math.hypot(uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx);
	}
	return out;
}
