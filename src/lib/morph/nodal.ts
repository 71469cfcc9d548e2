import { MorphError } from './errors';
import type { MapKind, MapLocation, Surface } from './types';

/** A map on a mesh, as matched: one of the four kinds of DESIGN (vector by face is spread like the others). */
export interface NodalMap {
	kind: MapKind;
	location: MapLocation;
	/** Per vertex or face: density per m of outward move per m^2; nodal per m; vector per m, three numbers. */
	values: Float64Array;
	/** Whether a positive value says that moving outward raises the objective or lowers it (then the map is negated). */
	outward: 'raises' | 'lowers';
}

/**
 * The nodal gradient g_v = dJ/dx_v.
 *
 * density at vertices: s_v m_v n_v; nodal at vertices: d_v n_v; vector at vertices: as it is. At faces, each face gives
 * a third to each corner: density s_f A_f n_f / 3, nodal d_f n_f / 3, vector g_f / 3, with the face's own normal.
 *
 * @returns N x 3, objective per metre
 * @throws MorphError map-shape when the number of values does not fit
 */
export function nodalGradient(map: NodalMap, surface: Surface): Float64Array {
	const { kind, location, values } = map;
	const { positions, triangles, mass, normals } = surface;
	const n = positions.length / 3;
	const count = (location === 'vertex' ? n : triangles.length / 3) * (kind === 'vector' ? 3 : 1);
	if (values.length !== count) {
		throw new MorphError(
			'map-shape',
			`The map has ${values.length} values; this shape needs ${count} (${kind} by ${location}).`,
			'Choose the kind and location that the file holds, or the shape that it belongs to.'
		);
	}
	const sign = map.outward === 'raises' ? 1 : -1;
	const out = new Float64Array(3 * n);
	if (location === 'vertex') {
		for (let v = 0; v < n; v++) {
			const s = kind === 'vector' ? 0 : sign * values[v] * (kind === 'density' ? mass[v] : 1);
			for (let d = 0; d < 3; d++) {
				out[3 * v + d] = kind === 'vector' ? sign * values[3 * v + d] : s * normals[3 * v + d];
			}
		}
		return out;
	}
	for (let t = 0; t < triangles.length / 3; t++) {
		const a = 3 * triangles[3 * t];
		const b = 3 * triangles[3 * t + 1];
		const c = 3 * triangles[3 * t + 2];
		let x, y, z;
		if (kind === 'vector') {
			x = (sign * values[3 * t]) / 3;
			y = (sign * values[3 * t + 1]) / 3;
			z = (sign * values[3 * t + 2]) / 3;
		} else {
			const ux = positions[b] - positions[a];
			const uy = positions[b + 1] - positions[a + 1];
			const uz = positions[b + 2] - positions[a + 2];
			const vx = positions[c] - positions[a];
			const vy = positions[c + 1] - positions[a + 1];
			const vz = positions[c + 2] - positions[a + 2];
			x = uy * vz - uz * vy;
			y = uz * vx - ux * vz;
			z = ux * vy - uy * vx;
			const length = Math.sqrt(x * x + y * y + z * z);
			if (length === 0) continue;
			// Half the cross product is A n.
			const f = (sign * values[t] * (kind === 'density' ? 0.5 : 1 / length)) / 3;
			x *= f;
			y *= f;
			z *= f;
		}
		for (const v of [a, b, c]) {
			out[v] += x;
			out[v + 1] += y;
			out[v + 2] += z;
		}
	}
	return out;
}

/** What moving the whole surface outward by one metre would change to first order: sum of g . n. */
export function mapTotal(gradient: Float64Array, surface: Surface): number {
	let sum = 0;
	for (let i = 0; i < gradient.length; i++) sum += gradient[i] * surface.normals[i];
	return sum;
}

/**
 * Any map as a density for colouring: (g . n) / m, objective per metre of outward move per square metre.
 * @param gradient N x 3 from nodalGradient
 * @returns N; 0 where a vertex has no area
 */
export function displayDensity(gradient: Float64Array, surface: Surface): Float32Array {
	const { mass, normals } = surface;
	const out = new Float32Array(mass.length);
	for (let v = 0; v < out.length; v++) {
		if (mass[v] === 0) continue;
		out[v] =
			(gradient[3 * v] * normals[3 * v] +
				gradient[3 * v + 1] * normals[3 * v + 1] +
				gradient[3 * v + 2] * normals[3 * v + 2]) /
			mass[v];
	}
	return out;
}
